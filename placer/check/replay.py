"""Replay program and placed circuit on the same bits, a thousand inputs at once.

In: a case.  Out: findings where a placed step gets or gives other bits than the
program says, or where workspace is not what its lease says.

A gate that branches (h, rx, ...) puts fresh bits on its target, keyed by its step, the
same ones in both circuits.  A state is a sum over paths, one per choice of those bits,
and the amplitude of a path is the product of what each step does between its bits.  If
every step gets and gives the same bits along every path, and does the same between them
(`circuits` proves that, phases included), the two circuits are equal.
"""

from __future__ import annotations

import random
from typing import TYPE_CHECKING

from placer.check.plain import one_qubit
from placer.program.signature import apply, digits, numbers, promised, value_widths

if TYPE_CHECKING:
    from placer.check.case import Case, Planned
    from placer.program.model import Operation
    from placer.program.signature import Signature
    from placer.recipes.circuit import Built

SAMPLES = 1024
ALL_ON = (1 << SAMPLES) - 1
FREE = 10  # wires that start unknown whose inputs are all tried: 2^10 = SAMPLES
MOST_FINDINGS = 20
SMALL = 1e-9
TWO_WIRE = {"ch": "h", "crx": "rx", "cry": "ry"}

Bits = list[int]


def random_bits(*key: object) -> int:
    """Return random bits for all samples, by a key.

    The first three eighths are fair; in each further eighth ones are more likely than
    in the one before, since a product of many bits is hardly ever 1 by chance.
    """
    draw = random.Random(":".join(str(part) for part in key))
    bits = draw.getrandbits(SAMPLES)
    for eighth in range(3, 8):
        bits |= draw.getrandbits(SAMPLES) & (ALL_ON << (SAMPLES * eighth // 8)) & ALL_ON
    return bits


def counting_bits(place: int) -> int:
    """Return bit `place` of the number of each sample."""
    run = 1 << place
    block = ((1 << run) - 1) << run
    return sum(block << (2 * run * n) for n in range(SAMPLES // (2 * run)))


def check_replay(case: Case, seed: int) -> None:
    """Placed steps get and give the program's bits; workspace comes back."""
    _Replay(case, seed).check()


class _Replay:
    """The bits of the program's wires, and those of the sites."""

    def __init__(self, case: Case, seed: int) -> None:
        self.case = case
        self.seed = seed
        program = case.program
        self.wires: Bits = [0] * len(program.wire_names)
        unknown = [w for w in range(len(self.wires)) if _is_unknown(case, w)]
        for place, wire in enumerate(unknown):
            counted = len(unknown) <= FREE
            self.wires[wire] = (
                counting_bits(place) if counted else random_bits(seed, "input", wire)
            )
        self.sites: Bits = [0] * len(case.device.sites)
        for wire in unknown:
            self.sites[case.sites[wire]] = self.wires[wire]
        self.before: dict[int, Bits] = {}
        self.after: dict[int, Bits] = {}
        self.said: dict[str, int] = {}
        self.heard: dict[str, int] = {}
        self.found = 0

    def find(self, rule: str, where: str, what: str) -> None:
        self.found += 1
        self.case.find(rule, where, what)

    def check(self) -> None:
        program = self.case.program
        for op in program.operations:
            bits = [self.wires[w] for w in op.wires]
            self.before[op.index] = list(bits)
            meaning(op, bits, self.seed, self.said)
            self.after[op.index] = bits
            for at, value in zip(op.wires, bits, strict=True):
                self.wires[at] = value
        last = self._last_steps()
        for step in self.case.order():
            if self.found > MOST_FINDINGS:
                return
            self._step(step)
            for wire in step.op.wires:
                register = program.register_at(wire)
                if register.workspace and last[wire] == step.op.index:
                    self._ends_clean(wire, step)
        for number, value in enumerate(self.wires):
            kept = not program.register_at(number).workspace
            if not kept or not (_is_unknown(self.case, number) or number in last):
                continue
            if self.sites[self.case.sites[number]] != value:
                name = program.wire_names[number]
                text = f"site {self.case.sites[number]} ends with other values"
                self.find("function-differs", f"wire {name}", text)
        self._check_bits()

    def _last_steps(self) -> dict[int, int]:
        return {w: s.op.index for s in self.case.order() for w in s.op.wires}

    def _ends_clean(self, wire: int, step: Planned) -> None:
        site = self.case.sites[wire]
        if self.sites[site]:
            name = self.case.program.wire_names[wire]
            text = f"site {site} is not in |0> after {step.label}, its last step"
            self.find("workspace-not-returned", f"wire {name}", text)
            self.sites[site] = 0

    def _check_bits(self) -> None:
        """Each classical bit is written last by the same measurement."""
        planned = [step.op for step in self.case.order()]
        for bit, index in _writers(self.case.program.operations).items():
            other = _writers(planned)[bit]
            if other != index:
                text = f"step {other} writes it last, in the program step {index}"
                self.find("function-differs", f"bit {bit}", text)

    def _step(self, step: Planned) -> None:
        sites = self.sites
        slots = step.where[len(step.op.wires) :]
        held = [sites[p] for p in slots]
        for lease, value in zip(step.leases, held, strict=True):
            if lease.kind == "clean" and value:
                text = f"site {lease.site} is leased as clean and is not in |0>"
                self.find("slot-not-clean", f"{step.label}, slot {lease.slot}", text)
        got = [sites[p] for p in step.where[: len(step.op.wires)]]
        if step.op.is_call and is_made_of_bits(step.built):
            self._coarse(step)
        else:
            # Slots come back as they were: only the operands change.
            bits = list(got)
            meaning(step.op, bits, self.seed, self.heard)
            for site, value in zip(step.where[: len(bits)], bits, strict=True):
                sites[site] = value
        gave = [sites[p] for p in step.where[: len(step.op.wires)]]
        self._compare(step, got, gave)
        for lease, value in zip(step.leases, held, strict=True):
            if lease.kind == "clean" and sites[lease.site]:
                text = f"site {lease.site} is not back in |0>"
                self.find("slot-not-returned", f"{step.label}, slot {lease.slot}", text)
            elif lease.kind == "borrowed" and sites[lease.site] != value:
                text = f"site {lease.site} does not come back as it was"
                self.find("borrowed-changed", f"{step.label}, slot {lease.slot}", text)

    def _compare(self, step: Planned, got: Bits, gave: Bits) -> None:
        names = self.case.program.wire_names
        pairs = ((self.before, got, "gets"), (self.after, gave, "gives"))
        for expected, found, word in pairs:
            wanted = expected[step.op.index]
            if found == wanted:
                continue
            at = next(i for i, bits in enumerate(wanted) if bits != found[i])
            text = f"{word} other values of {names[step.op.wires[at]]} on site "
            self.find("function-differs", step.label, f"{text}{step.where[at]}")
            # What follows from this is not said again.
            for site, value in zip(step.where, self.after[step.op.index], strict=False):
                self.sites[site] = value
            return

    def _coarse(self, step: Planned) -> None:
        """Run a recipe's coarse circuit on the sites of its wires.

        Of two h on a wire the second takes back what the first did: between them the
        wire is toggled by a phase.  After one h and a measurement it holds a random
        outcome.
        """
        sites = self.sites
        framed: dict[int, int] = {}
        bits: dict[int, int] = {}
        for number, op in enumerate(step.built.coarse.ops):
            where = [step.where[w] for w in op.wires]
            allowed = ALL_ON if op.condition is None else bits.get(op.condition, 0)
            if op.name in ("x", "cx", "ccx", "mcx"):
                for site in where[:-1]:
                    allowed &= sites[site]
                sites[where[-1]] ^= allowed
            elif op.name == "swap":
                sites[where[0]], sites[where[1]] = sites[where[1]], sites[where[0]]
            elif op.name == "h" and where[0] in framed:
                sites[where[0]] = framed.pop(where[0])
            elif op.name == "h":
                framed[where[0]] = sites[where[0]]
                key = (self.seed, step.op.index, number)
                sites[where[0]] = random_bits(*key)
            elif op.name == "measure":
                framed.pop(where[0], None)
                bits[op.bit or 0] = sites[where[0]]


def is_made_of_bits(built: Built) -> bool:
    """Whether a coarse circuit toggles bits, apart from frames of h.

    Arithmetic in the Fourier basis does not; `circuits` follows it exactly.
    """
    names = {op.name for op in built.coarse.ops}
    return not ("h" in names and names & {"p", "cp", "mcp"})


def _is_unknown(case: Case, wire: int) -> bool:
    register = case.program.register_at(wire)
    return register.start == "unknown" and not register.workspace


def _writers(operations: tuple[Operation, ...] | list[Operation]) -> dict[str, int]:
    return {op.bit: op.index for op in operations if op.bit is not None}


def meaning(
    op: Operation, bits: Bits, seed: int, outcomes: dict[str, int] | None = None
) -> None:
    """Do a step as the program means it, on the bits of its wires.

    `outcomes` holds what was measured into each classical bit.
    """
    outcomes = {} if outcomes is None else outcomes
    before = list(bits)
    _meaning(op, bits, seed)
    if op.bit is not None:
        outcomes[op.bit] = bits[0]
    if op.condition is not None:
        on = outcomes.get(op.condition, 0)
        for place, (old, new) in enumerate(zip(before, bits, strict=True)):
            bits[place] = (new & on) | (old & ~on & ALL_ON)


def _meaning(op: Operation, bits: Bits, seed: int) -> None:
    if op.signature is not None:
        _arithmetic(op.signature, bits)
    elif op.kind in ("mcx", "and"):
        toggle = ALL_ON
        for value in bits[:-1]:
            toggle &= value
        bits[-1] ^= toggle
    elif op.kind == "reset":
        bits[:] = [0] * len(bits)
    elif op.kind == "gate":
        _gate(op, bits, seed)


def _arithmetic(signature: Signature, bits: Bits) -> None:
    """Do arithmetic on the numbers of each sample, by the definition of its kind."""
    widths = value_widths(signature)
    rows = [format(value, f"0{SAMPLES}b")[::-1] for value in bits]
    results = [0] * len(bits)
    known: dict[tuple[int, ...], list[int]] = {}
    for sample in range(SAMPLES):
        held = tuple(int(row[sample]) for row in rows)
        if held not in known:
            values = numbers(held, widths)
            good = promised(signature, values)
            known[held] = digits(apply(signature, values), widths) if good else [*held]
        for place, bit in enumerate(known[held]):
            results[place] |= bit << sample
    bits[:] = results


def _gate(op: Operation, bits: Bits, seed: int) -> None:
    if op.name in ("cx", "cy"):
        bits[1] ^= bits[0]
    elif op.name == "swap":
        bits.reverse()
    elif op.name == "rxx":
        toggle = random_bits(seed, op.index)
        bits[0] ^= toggle
        bits[1] ^= toggle
    elif op.name in TWO_WIRE:
        made = _branch(op, TWO_WIRE[op.name], bits[1], seed)
        bits[1] = (made & bits[0]) | (bits[1] & ~bits[0] & ALL_ON)
    elif len(bits) == 1:
        bits[0] = _branch(op, op.name, bits[0], seed)


def _branch(op: Operation, name: str, bits: int, seed: int) -> int:
    """Return the bits after a one-qubit gate: kept, flipped, or fresh."""
    matrix = one_qubit(name, op.params)
    if abs(matrix[0][1]) < SMALL:
        return bits
    if abs(matrix[0][0]) < SMALL:
        return bits ^ ALL_ON
    return random_bits(seed, op.index)
