"""Replay OpenQASM 2 and 3 texts, and compare a placed text with its source.

Knows nothing of the package under test: only `re`, `random`, `math`, `cmath`.  Texts
are run on a sparse state vector, so that phases count too.  Measurements of the
source's own bits are deferred (a bit is one more coordinate); measurements into bits
that the source does not have are measured cleanup, and their outcomes are drawn.
"""

from __future__ import annotations

import cmath
import math
import random
import re
from dataclasses import dataclass, field

LARGEST_STATE = 1 << 14
_TINY = 1e-9
_TOKEN = re.compile(r"\s+")


class UnreadableError(Exception):
    """The text holds something that this reader does not replay."""


@dataclass
class Gate:
    """A user's gate: parameter names, qubit names, body statements."""

    params: list[str]
    qubits: list[str]
    body: list[str]


@dataclass
class Text:
    """A text taken apart: declarations in order, and statements in order."""

    version: int = 3
    qubits: dict[str, int] = field(default_factory=dict)
    bits: dict[str, int] = field(default_factory=dict)
    workspace: set[str] = field(default_factory=set)
    gates: dict[str, Gate] = field(default_factory=dict)
    statements: list[str] = field(default_factory=list)
    layout: dict[str, int] = field(default_factory=dict)
    renamed: dict[str, str] = field(default_factory=dict)

    @property
    def wires(self) -> list[str]:
        return [w for name in self.qubits for w in self.expand(name)]

    def expand(self, operand: str) -> list[str]:
        """Return the wires (or bits) that an operand names, one by one."""
        operand = operand.strip()
        if operand.startswith("$"):
            return [operand]
        match = re.fullmatch(r"(\w+)\s*(?:\[\s*(\d+)\s*\])?", operand)
        if not match:
            raise UnreadableError(f"operand {operand!r}")
        name, index = match.groups()
        width = self.qubits.get(name, self.bits.get(name))
        if width is None:
            raise UnreadableError(f"unknown name {name!r}")
        if index is not None:
            if width == 0 or int(index) >= width:
                raise UnreadableError(f"{operand!r} is out of range")
            return [f"{name}[{index}]"]
        return [name] if width == 0 else [f"{name}[{i}]" for i in range(width)]


# --------------------------------------------------------------------------- reading


def read(text: str) -> Text:
    """Take a text apart, without running it."""
    out = Text()
    pending: list[str] = []
    lines: list[str] = []
    for raw in re.sub(r"/\*.*?\*/", "", text, flags=re.DOTALL).splitlines():
        line = raw.strip()
        if line.startswith(("@", "//@")):
            lines.append("@" + line.split("@", 1)[1] + "\0")
        elif line.startswith(("pragma", "#pragma")):
            _pragma(out, line)
        else:
            lines.append(line.split("//", 1)[0])
    for statement in _split("\n".join(lines)):
        while statement.startswith("@"):
            note, statement = statement.split("\0", 1)
            pending.append(note)
            statement = statement.strip()
        if statement:
            _top(out, statement, pending)
            pending = []
    return out


def _pragma(out: Text, line: str) -> None:
    words = line.split()[1:]
    if words[0] == "placer.layout":
        for word in words[1:]:
            name, site = word.split("=$")
            out.layout[name] = int(site)
    elif words[0] == "placer.renamed":
        out.renamed.update(word.split("=") for word in words[1:])


def _split(text: str) -> list[str]:
    """Split at `;` and after `}` outside of braces."""
    parts: list[str] = []
    depth = 0
    current = ""
    for char in text:
        current += char
        depth += (char == "{") - (char == "}")
        if depth == 0 and char in ";}":
            parts.append(current.strip().removesuffix(";").strip())
            current = ""
    if current.strip():
        raise UnreadableError(f"unfinished statement {current.strip()!r}")
    return parts


def _top(out: Text, statement: str, notes: list[str]) -> None:
    word = re.match(r"[\w]+|.", statement).group()  # type: ignore[union-attr]
    if word == "OPENQASM":
        out.version = int(float(statement.split()[1]))
    elif word == "include":
        return
    elif word in ("qubit", "qreg", "bit", "creg"):
        _declare(out, statement, notes)
    elif word == "gate":
        head, body = statement.split("{", 1)
        match = re.fullmatch(r"gate\s+(\w+)\s*(?:\(([^)]*)\))?\s*(.*)", head.strip())
        if not match:
            raise UnreadableError(head)
        name, params, qubits = match.groups()
        out.gates[name] = Gate(
            [p.strip() for p in (params or "").split(",") if p.strip()],
            [q.strip() for q in qubits.split(",")],
            _split(body.rsplit("}", 1)[0]),
        )
    else:
        out.statements.append(statement)


def _declare(out: Text, statement: str, notes: list[str]) -> None:
    match = re.fullmatch(r"(?:qubit|bit)\s*(?:\[\s*(\d+)\s*\])?\s*(\w+)", statement)
    if match:
        width, name = match.groups()
    else:
        match = re.fullmatch(r"(?:qreg|creg)\s+(\w+)\s*(?:\[\s*(\d+)\s*\])?", statement)
        if not match:
            raise UnreadableError(statement)
        name, width = match.groups()
    target = out.qubits if statement.startswith("q") else out.bits
    target[name] = int(width) if width else 0
    if any(note.startswith("@placer.workspace") for note in notes):
        out.workspace.add(name)


# --------------------------------------------------------------------------- running

_H = 1 / math.sqrt(2)


def matrix(name: str, params: list[float]) -> list[complex]:
    """Return a one-qubit matrix, row by row."""
    half = params[0] / 2 if params else 0.0
    if name in ("u", "U", "u3"):
        theta, phi, lam = params
        c, s = math.cos(theta / 2), math.sin(theta / 2)
        return [
            c,
            -cmath.exp(1j * lam) * s,
            cmath.exp(1j * phi) * s,
            cmath.exp(1j * (phi + lam)) * c,
        ]
    c, s = math.cos(half), math.sin(half)
    phases = {
        "id": 0.0,
        "z": math.pi,
        "s": math.pi / 2,
        "sdg": -math.pi / 2,
        "t": math.pi / 4,
        "tdg": -math.pi / 4,
        "p": params[0] if params else 0.0,
        "u1": params[0] if params else 0.0,
    }
    if name in phases:
        return [1, 0, 0, cmath.exp(1j * phases[name])]
    fixed: dict[str, list[complex]] = {
        "x": [0, 1, 1, 0],
        "y": [0, -1j, 1j, 0],
        "h": [_H, _H, _H, -_H],
        "sx": [(1 + 1j) / 2, (1 - 1j) / 2, (1 - 1j) / 2, (1 + 1j) / 2],
        "sxdg": [(1 - 1j) / 2, (1 + 1j) / 2, (1 + 1j) / 2, (1 - 1j) / 2],
        "rx": [c, -1j * s, -1j * s, c],
        "ry": [c, -s, s, c],
        "rz": [cmath.exp(-1j * half), 0, 0, cmath.exp(1j * half)],
    }
    if name not in fixed:
        raise UnreadableError(f"gate {name!r}")
    return fixed[name]


_CONTROLLED = {
    "cx": (1, "x"),
    "CX": (1, "x"),
    "cy": (1, "y"),
    "cz": (1, "z"),
    "ch": (1, "h"),
    "cp": (1, "p"),
    "cu1": (1, "p"),
    "cphase": (1, "p"),
    "phase": (0, "p"),
    "crx": (1, "rx"),
    "cry": (1, "ry"),
    "crz": (1, "rz"),
    "ccx": (2, "x"),
    "ccz": (2, "z"),
}
_QUBITS_OF_BUILT_IN = {"swap": 2, "cswap": 3, "rzz": 2, "rxx": 2}


@dataclass
class Run:
    """A sparse state: coordinates by name, amplitudes by the bits of an integer."""

    text: Text
    own_bits: set[str]
    chance: random.Random
    place: dict[str, int] = field(default_factory=dict)
    state: dict[int, complex] = field(default_factory=lambda: {0: 1})
    drawn: dict[str, int] = field(default_factory=dict)
    newest: dict[str, str] = field(default_factory=dict)
    versions: dict[str, int] = field(default_factory=dict)

    def at(self, name: str) -> int:
        """Return the mask of a coordinate, made on first use (as 0)."""
        if name not in self.place:
            self.place[name] = len(self.place)
        return 1 << self.place[name]

    def constant(self, mask: int) -> int | None:
        """Return the value of a coordinate if it is the same everywhere."""
        values = {bool(key & mask) for key in self.state}
        return int(values.pop()) if len(values) == 1 else None

    # ------------------------------------------------------------------ statements

    def all(self) -> None:
        for statement in self.text.statements:
            self.statement(statement, [])

    def statement(self, statement: str, conditions: list[int]) -> None:
        if statement.startswith("if"):
            self.when(statement, conditions)
        elif statement.startswith("barrier"):
            return
        elif statement.startswith("reset"):
            for wire in self.text.expand(statement[5:]):
                self.reset(wire)
        elif re.search(r"\bmeasure\b", statement):
            self.measure_statement(statement)
        else:
            self.call(statement, {}, {}, conditions)

    def when(self, statement: str, conditions: list[int]) -> None:
        match = re.fullmatch(
            r"if\s*\(\s*([\w\[\]]+)\s*(?:==\s*(\d+))?\s*\)\s*\{?(.*?)\}?",
            statement,
            re.DOTALL,
        )
        if not match:
            raise UnreadableError(statement)
        name, value, body = match.groups()
        wanted = 1 if value is None else int(value)
        bits = self.text.expand(name)
        inner = list(conditions)
        for i, bit in enumerate(bits):
            need = wanted >> i & 1
            if bit in self.drawn:
                if self.drawn[bit] != need:
                    return
            else:
                # The sign says which value is needed: ~mask for 0.
                mask = self.at(self.newest.get(bit, f"{bit}#0"))
                inner.append(mask if need else ~mask)
        for part in _split(body if body.rstrip().endswith(";") else body + ";"):
            if part:
                self.statement(part, inner)

    def measure_statement(self, statement: str) -> None:
        if "->" in statement:
            source, target = statement.removeprefix("measure").split("->")
        elif "=" in statement:
            target, source = statement.split("=")
            source = source.strip().removeprefix("measure")
        else:
            raise UnreadableError(statement)
        wires, bits = self.text.expand(source), self.text.expand(target)
        if len(wires) != len(bits):
            raise UnreadableError(statement)
        for wire, bit in zip(wires, bits, strict=True):
            if bit.split("[")[0] in self.own_bits:
                self.copy_out(wire, bit)
            else:
                self.drawn[bit] = self.collapse(wire)

    def copy_out(self, wire: str, bit: str) -> None:
        self.versions[bit] = self.versions.get(bit, 0) + 1
        name = f"{bit}#{self.versions[bit]}"
        self.newest[bit] = name
        source, target = self.at(wire), self.at(name)
        self.state = {
            (k | target if k & source else k): a for k, a in self.state.items()
        }

    def collapse(self, wire: str) -> int:
        mask = self.at(wire)
        one = sum(abs(a) ** 2 for k, a in self.state.items() if k & mask)
        outcome = int(self.chance.random() < one)
        kept = {k: a for k, a in self.state.items() if bool(k & mask) == bool(outcome)}
        norm = math.sqrt(sum(abs(a) ** 2 for a in kept.values()))
        self.state = {k: a / norm for k, a in kept.items()}
        return outcome

    def reset(self, wire: str) -> None:
        mask = self.at(wire)
        value = self.constant(mask)
        if value is None:
            # The old value leaves into a coordinate of its own.
            count = self.versions.get(f"lost {wire}", 0) + 1
            self.versions[f"lost {wire}"] = count
            lost = self.at(f"lost {wire}#{count}")
            self.state = {
                (k & ~mask | lost if k & mask else k): a for k, a in self.state.items()
            }
        elif value:
            self.state = {k & ~mask: a for k, a in self.state.items()}

    # ----------------------------------------------------------------------- gates

    def call(
        self,
        statement: str,
        wires: dict[str, str],
        values: dict[str, float],
        conditions: list[int],
    ) -> None:
        *modifiers, gate = [part.strip() for part in statement.split("@")]
        match = re.fullmatch(
            r"(\w+)\s*(\((?:[^()]|\([^()]*\))*\))?\s*(.*)", gate, re.DOTALL
        )
        if not match:
            raise UnreadableError(statement)
        name, params, operands = match.groups()
        angles = []
        if params:
            angles = [_value(p, values) for p in params[1:-1].split(",") if p.strip()]
        signs: list[bool] = []
        inverse = False
        for modifier in modifiers:
            kind, count = re.fullmatch(  # type: ignore[union-attr]
                r"(\w+)\s*(?:\(\s*(\d+)\s*\))?", modifier
            ).groups()
            if kind in ("ctrl", "negctrl"):
                signs += [kind == "ctrl"] * int(count or 1)
            elif kind == "inv":
                inverse = not inverse
            else:
                raise UnreadableError(statement)
        lists = []
        for operand in operands.split(","):
            operand = operand.strip()
            if wires:
                lists.append([wires[operand]])
            else:
                lists.append(self.text.expand(operand))
        width = max(len(x) for x in lists)
        for i in range(width):
            row = [x[i] if len(x) > 1 else x[0] for x in lists]
            if len(set(row)) != len(row):
                raise UnreadableError(f"one wire twice in {statement!r}")
            self.apply(name, angles, row, signs, inverse, conditions)

    def apply(
        self,
        name: str,
        angles: list[float],
        row: list[str],
        signs: list[bool],
        inverse: bool,
        conditions: list[int],
    ) -> None:
        masks = [self.at(w) for w in row[: len(signs)]]
        inner = conditions + [
            m if sign else ~m for m, sign in zip(masks, signs, strict=True)
        ]
        row = row[len(signs) :]
        if name in self.text.gates:
            self.user(name, angles, row, inverse, inner)
        elif name in _QUBITS_OF_BUILT_IN:
            self.built_in(name, [-a for a in angles] if inverse else angles, row, inner)
        else:
            controls, base = _CONTROLLED.get(name, (0, name))
            if len(row) != controls + 1:
                raise UnreadableError(f"{name} on {len(row)} wires")
            inner = inner + [self.at(w) for w in row[:controls]]
            self.one(matrix(base, angles), inverse, self.at(row[-1]), inner)

    def user(
        self,
        name: str,
        angles: list[float],
        row: list[str],
        inverse: bool,
        conditions: list[int],
    ) -> None:
        gate = self.text.gates[name]
        if len(row) != len(gate.qubits) or len(angles) != len(gate.params):
            raise UnreadableError(f"{name} has other arguments")
        wires = dict(zip(gate.qubits, row, strict=True))
        values = dict(zip(gate.params, angles, strict=True))
        body = [s for s in gate.body if s and not s.startswith("barrier")]
        for statement in reversed(body) if inverse else body:
            text = f"inv @ {statement}" if inverse else statement
            self.call(text, wires, values, conditions)

    def built_in(
        self, name: str, angles: list[float], row: list[str], conditions: list[int]
    ) -> None:
        x = matrix("x", [])
        if name in ("swap", "cswap"):
            a, b = self.at(row[-2]), self.at(row[-1])
            extra = [self.at(row[0])] if name == "cswap" else []
            self.one(x, False, b, [*conditions, a])
            self.one(x, False, a, [*conditions, b, *extra])
            self.one(x, False, b, [*conditions, a])
            return
        a, b = self.at(row[0]), self.at(row[1])
        turn = matrix("h", []) if name == "rxx" else matrix("id", [])
        for mask in (a, b):
            self.one(turn, False, mask, conditions)
        self.one(x, False, b, [*conditions, a])
        self.one(matrix("rz", angles), False, b, conditions)
        self.one(x, False, b, [*conditions, a])
        for mask in (a, b):
            self.one(turn, False, mask, conditions)

    def one(
        self, gate: list[complex], inverse: bool, mask: int, conditions: list[int]
    ) -> None:
        a, b, c, d = gate
        if inverse:
            a, b, c, d = (complex(v).conjugate() for v in (a, c, b, d))
        new: dict[int, complex] = {}
        for key, amplitude in self.state.items():
            if not all(key & m if m > 0 else not key & ~m for m in conditions):
                new[key] = new.get(key, 0) + amplitude
                continue
            stay, go = (d, b) if key & mask else (a, c)
            if stay:
                new[key] = new.get(key, 0) + stay * amplitude
            if go:
                new[key ^ mask] = new.get(key ^ mask, 0) + go * amplitude
        self.state = {k: v for k, v in new.items() if abs(v) > _TINY}
        if len(self.state) > LARGEST_STATE:
            raise UnreadableError("the state has too many branches to replay")


def _value(text: str, values: dict[str, float]) -> float:
    text = text.strip().replace("π", "pi")
    if not re.fullmatch(r"[\w.+\-*/() ]+", text):
        raise UnreadableError(f"parameter {text!r}")
    names = {"pi": math.pi, "tau": math.tau, **values}
    for word in re.findall(r"(?<![\w.])[A-Za-z_]\w*", text):
        if word not in names:
            raise UnreadableError(f"parameter {text!r}")
    return float(eval(text, {"__builtins__": {}}, names))


# ------------------------------------------------------------------------- comparing


def same_function(
    source_text: str,
    placed_text: str,
    samples: int = 8,
    seed: int = 0,
    *,
    open_inputs: bool = False,
    branches: int = 3,
) -> list[str]:
    """Return how a placed text differs from its source; empty if it does not.

    Every sample starts both from the same random superposition of `branches` basis
    states of the inputs; every other site starts from a random bit, since a physical
    qubit is undefined until it is reset.  OpenQASM 2 wires and wires that the source
    marks as workspace start in |0> unless `open_inputs` (then only workspace does).
    """
    source, placed = read(source_text), read(placed_text)
    chance = random.Random(seed)
    differences: list[str] = []
    for sample in range(samples):
        found = _compare(source, placed, chance, open_inputs, branches)
        if found:
            differences.append(f"sample {sample}: {found}")
    return differences


def _sites(placed: Text) -> list[int]:
    numbers = set(placed.layout.values())
    for statement in placed.statements:
        numbers.update(int(n) for n in re.findall(r"\$(\d+)", statement))
    return sorted(numbers)


def _compare(
    source: Text,
    placed: Text,
    chance: random.Random,
    open_inputs: bool,
    branches: int,
) -> str:
    back = {new: old for old, new in placed.renamed.items()}
    theirs = {back.get(name, name) for name in placed.bits} & set(source.bits)
    first = Run(source, set(source.bits), chance)
    own = {placed.renamed.get(name, name) for name in source.bits}
    second = Run(placed, own, chance)
    if theirs != set(source.bits):
        return f"bits {sorted(set(source.bits) - theirs)} are not declared"
    compared = [w for w in source.wires if w.split("[")[0] not in source.workspace]
    zero = set(source.wires) - set(compared)
    if source.version == 2 and not open_inputs:
        zero = set(source.wires)
    missing = [w for w in compared if w not in placed.layout]
    sites = _sites(placed)
    fresh = _reset_first(source)
    # One bit for a site that holds no input; inputs vary from branch to branch.
    undefined = {site: chance.randrange(2) for site in sites}
    constant = {w: chance.randrange(2) for w in sorted(fresh)}
    inputs = [w for w in source.wires if w not in zero]
    starts: dict[int, complex] = {}
    images: dict[int, complex] = {}
    for _ in range(branches):
        bits = {w: constant.get(w, chance.randrange(2)) for w in inputs}
        amplitude = cmath.rect(chance.uniform(0.5, 1), chance.uniform(0, math.tau))
        held = dict(undefined)
        held |= {placed.layout[w]: bits[w] for w in inputs if w in placed.layout}
        key = sum(first.at(w) for w in inputs if bits[w])
        image = sum(second.at(f"${s}") for s in sites if held[s])
        starts[key] = amplitude
        images[image] = amplitude
    if len(starts) != len(images):
        return "two inputs share a site"
    first.state, second.state = starts, images
    for run in (first, second):
        norm = math.sqrt(sum(abs(a) ** 2 for a in run.state.values()))
        run.state = {k: a / norm for k, a in run.state.items()}
        run.all()
    for wire in missing:
        is_input = wire in inputs and wire not in fresh
        if first.constant(first.at(wire)) != 0 or is_input:
            return f"wire {wire} is not in the layout"
    busy = {placed.layout[w] for w in compared if w in placed.layout}
    touched = _reset_sites(placed)
    for site in sites:
        if site not in busy:
            wanted = 0 if site in touched else undefined[site]
            if second.constant(second.at(f"${site}")) != wanted:
                return f"site ${site} is not given back as {wanted}"
    return _overlap(first, second, [w for w in compared if w not in missing], placed)


def _reset_first(source: Text) -> set[str]:
    """Return the wires whose first statement is a reset: their start never matters."""
    seen: set[str] = set()
    fresh: set[str] = set()
    for statement in source.statements:
        names = re.findall(r"[A-Za-z_]\w*(?:\[\d+\])?", statement)
        wires = [
            w
            for n in names
            if n.split("[")[0] in source.qubits
            for w in source.expand(n)
        ]
        if statement.startswith("reset"):
            fresh |= set(wires) - seen
        seen |= set(wires)
    return fresh


def _reset_sites(placed: Text) -> set[int]:
    """Return where what is reset started, swaps between physical qubits followed."""
    started: dict[int, int] = {}
    touched = set()
    for statement in placed.statements:
        if statement.startswith("reset"):
            site = int(statement.split("$")[1])
            touched.add(started.get(site, site))
        elif statement.startswith("swap $"):
            a, b = (int(n) for n in re.findall(r"\$(\d+)", statement))
            started[a], started[b] = started.get(b, b), started.get(a, a)
    return touched


def _overlap(first: Run, second: Run, wires: list[str], placed: Text) -> str:
    """Return a difference unless both states agree up to one overall phase."""
    layout = placed.layout
    names: list[tuple[str, str]] = [(w, f"${layout[w]}") for w in wires]
    for name in sorted(first.place):
        if "#" in name:
            other = name
            if name.startswith("lost "):
                wire = name.split("#")[0].removeprefix("lost ")
                other = f"lost ${layout.get(wire)}#{name.split('#')[1]}"
            else:
                register = re.split(r"[\[#]", name)[0]
                other = placed.renamed.get(register, register) + name[len(register) :]
            names.append((name, other))
    left = _projected(first, [a for a, _ in names])
    right = _projected(second, [b for _, b in names])
    inner = sum(left.get(k, 0).conjugate() * a for k, a in right.items())
    if abs(abs(inner) - 1) < 1e-6:
        return ""
    extra = [n for n in second.place if "lost" in n and n not in dict(names).values()]
    if extra:
        return f"{extra[0]}: a value is reset while it is entangled"
    if set(left) == set(right):
        return f"the phases differ (overlap {abs(inner):.3f})"
    for wire, site in names:
        one = [bool(k & first.at(wire)) for k in first.state]
        two = [bool(k & second.at(site)) for k in second.state]
        if sum(one) * len(two) != sum(two) * len(one):
            return f"{wire} at {site} differs (overlap {abs(inner):.3f})"
    return f"the states differ (overlap {abs(inner):.3f})"


def _projected(run: Run, names: list[str]) -> dict[int, complex]:
    masks = [run.at(name) for name in names]
    out: dict[int, complex] = {}
    for key, amplitude in run.state.items():
        short = sum(1 << i for i, mask in enumerate(masks) if key & mask)
        out[short] = out.get(short, 0) + amplitude
    return out
