"""Write a plan as placed OpenQASM 3 on physical qubits, before routing.

In: a plan, its program, its device.  Out: one text that any conforming reader accepts,
at the Toffoli level (coarse circuits) or spelled out (fine circuits).  Swaps of the
trial route are not written: the user's own router inserts its own.
"""

from __future__ import annotations

import hashlib
import json
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Literal

from placer.errors import InputError, Place
from placer.plan import Plan, to_json
from placer.problem import as_written
from placer.recipes import library
from placer.report.qasmgates import DEFINITIONS, call_gate, free_name, gate_text

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from placer.device.model import Device
    from placer.program.model import Operation, Program
    from placer.recipes.circuit import Built, Circuit, Op

Gates = Literal["toffoli", "clifford-t"]
GATE_LEVELS: tuple[Gates, ...] = ("toffoli", "clifford-t")
FORMAT = 1


@dataclass(frozen=True, slots=True)
class PlacedLease:
    """A slot's site, whether it must be in |0>, and whose site it is if lent."""

    slot: int
    site: int
    is_clean: bool
    lender: str | None


@dataclass(frozen=True, slots=True)
class PlacedStep:
    """One step in placed order with the circuit that its recipe builds."""

    operation: Operation
    built: Built
    start: int
    leases: tuple[PlacedLease, ...]


@dataclass(slots=True)
class Writer:
    """The text under construction, and the names and bits that it has used."""

    bits: Mapping[str, str]
    cleanup: str
    lines: list[str] = field(default_factory=list)
    cleanup_bits: int = 0
    used: set[str] = field(default_factory=set)

    def bit(self, bit: str) -> str:
        """Return a classical bit of the program as this text names it."""
        name, bracket, rest = bit.partition("[")
        return self.bits.get(name, name) + bracket + rest


def placed_qasm(
    plan: Plan | Mapping[str, Any],
    program: Program,
    device: Device,
    *,
    gates: Gates = "toffoli",
) -> str:
    """Return a plan as OpenQASM 3 on physical qubits `$n`, before routing.

    `plan` may be the raw data of a plan file, which should have been checked.  The
    level `toffoli` writes the coarse circuits, `clifford-t` the fine ones; a call on
    level 2 stays one controlled gate in both.

    Raises
    ------
    InputError
        If the plan does not place a wire or a slot that the program uses.
    """
    if isinstance(plan, Plan):
        text = to_json(plan)
        data: Mapping[str, Any] = json.loads(text)
    else:
        data = plan
        text = json.dumps(plan, indent=1, ensure_ascii=False) + "\n"
    digest = hashlib.sha256(text.encode()).hexdigest()
    steps = placed_steps(data, program)
    head = [
        f"placed by placer {data['version']}, before routing; {_level(gates)}",
        f"program: {program.name}  device: {device.name}",
        f"calibrated: {device.calibrated or 'not dated'}  plan: sha256 {digest}",
        f"start states: {program.assumed}",
        "The plan's figures are estimates from that calibration, not promises.",
    ]
    return write_steps(
        steps, data["wires"], program, head, is_fine=gates == "clifford-t"
    )


def placed_steps(data: Mapping[str, Any], program: Program) -> tuple[PlacedStep, ...]:
    """Return the steps of a plan in placed order: by (planned start, index)."""
    steps = [
        _step(program.operations[call["index"]], call["start"], call)
        for call in data["calls"]
    ]
    steps += [
        _step(program.operations[index], start, None)
        for index, start, _ in data["others"]
    ]
    return tuple(sorted(steps, key=lambda s: (s.start, s.operation.index)))


def _step(op: Operation, start: int, call: Mapping[str, Any] | None) -> PlacedStep:
    if call is None or not op.is_call:
        return PlacedStep(op, as_written(op), start, ())
    built = library.build_for(call["recipe"], op)
    leases = tuple(
        PlacedLease(x["slot"], x["site"], x["kind"] == "clean", x["lender"])
        for x in sorted(call["leases"], key=lambda x: int(x["slot"]))
    )
    return PlacedStep(op, built, start, leases)


def write_steps(
    steps: Sequence[PlacedStep],
    sites: Mapping[str, int],
    program: Program,
    head: Sequence[str],
    *,
    is_fine: bool,
) -> str:
    """Return the text for steps in placed order.

    `sites` maps a wire's name to its site, `head` holds comments for the top.
    """
    writer = open_writer(program)
    for step in steps:
        _write_step(writer, step, sites, program, is_fine)
    return framed(writer, steps, sites, program, head)


def open_writer(program: Program) -> Writer:
    """Return an empty text whose classical registers have names of their own."""
    taken: set[str] = set()
    bits = {name: free_name(name, taken) for name, _ in program.bits}
    return Writer(bits, free_name("cleanup", taken))


def framed(
    writer: Writer,
    steps: Sequence[PlacedStep],
    sites: Mapping[str, int],
    program: Program,
    head: Sequence[str],
    pragmas: Sequence[str] = (),
) -> str:
    """Return the whole text: header, layout, declarations, first resets, statements."""
    bits = writer.bits
    top = ["OPENQASM 3.0;", *(f"// {_one_line(line)}" for line in head)]
    top.append('include "stdgates.inc";')
    # Pragmas of ours in a source describe that file, not this one.
    kept = (_pragma(text) for text in program.kept)
    top += [text for text in kept if not text.startswith("pragma placer.")]
    top.append(f"pragma placer.format {FORMAT}")
    inputs, zero = _staying(steps, sites, program)
    layout = " ".join(
        f"{name}=${sites[name]}" for name in program.wire_names if name in inputs | zero
    )
    if layout:
        top.append(f"pragma placer.layout {layout}")
    renamed = " ".join(f"{old}={new}" for old, new in bits.items() if old != new)
    if renamed:
        top.append(f"pragma placer.renamed {renamed}")
    top += pragmas
    top += [DEFINITIONS[name] for name in sorted(writer.used)]
    top += [_declare(bits[name], width) for name, width in program.bits]
    if writer.cleanup_bits:
        top.append("// outcomes of measured cleanup")
        top.append(_declare(writer.cleanup, writer.cleanup_bits))
    lent = {x.site for step in steps for x in step.leases if x.is_clean}
    top += _first_resets(lent | {sites[w] for w in zero}, {sites[w] for w in inputs})
    return "\n".join([*top, "", *writer.lines]).rstrip("\n") + "\n"


def _write_step(
    writer: Writer,
    step: PlacedStep,
    sites: Mapping[str, int],
    program: Program,
    is_fine: bool,
) -> None:
    op = step.operation
    here = [_site_of(program, sites, wire) for wire in op.wires]
    kept = [annotation(a) for a in op.annotations if "placer." not in a[:8]]
    if op.is_call and op.signature is None and step.built.level2_wires:
        add_title(writer, step)
        chosen = ",".join(f"${here[w]}" for w in step.built.level2_wires)
        writer.lines += [*kept, f"@placer.level2 sites={chosen}"]
        writer.lines.append(call_gate(op, here))
        return
    slots = {lease.slot: lease.site for lease in step.leases}
    # Gates on level 2 have no spelling in the standard: they stay whole.
    is_whole = bool(step.built.level2_wires)
    circuit = step.built.fine if is_fine and not is_whole else step.built.coarse
    try:
        here += [slots[n] for n in range(len(circuit.slots))]
    except KeyError as error:
        raise InputError.at(
            op.place, "slot-not-placed", f"'{op.name}' has no site for slot {error}"
        ) from None
    statements = _statements(writer, op, circuit, here)
    if not statements:
        return
    if op.is_call:
        add_title(writer, step)
    lenders = [lease.lender for lease in step.leases if lease.lender is not None]
    if is_whole:
        chosen = ",".join(f"${here[w]}" for w in step.built.level2_wires)
        kept.append(f"@placer.level2 sites={chosen}")
    first = [*kept, *(f"@placer.borrow lender={name}" for name in lenders)]
    last = [f"@placer.return lender={name}" for name in lenders]
    writer.lines += [*first, *statements[:-1], *last, statements[-1]]


def add_title(writer: Writer, step: PlacedStep) -> None:
    """Add the comment that says which call and which recipe begin here."""
    op = step.operation
    where = f", line {op.place.line}" if op.place.line else ""
    inverse = " inverse" if op.inverse else ""
    writer.lines.append(
        f"// call {op.index}: {op.kind}{inverse}{op.title.removeprefix(op.kind)}, "
        f"recipe {step.built.recipe}{where}"
    )


def _statements(
    writer: Writer, op: Operation, circuit: Circuit, here: Sequence[int]
) -> list[str]:
    """Return the statements of one step; a run under one condition is one `if`."""
    if op.kind == "measure":
        target = "" if op.bit is None else f"{writer.bit(op.bit)} = "
        return [f"{target}measure ${here[0]};"]
    if op.kind == "barrier":
        return [f"barrier {', '.join(f'${site}' for site in here)};"]
    base = writer.cleanup_bits
    writer.cleanup_bits += circuit.bits
    statements: list[str] = []
    block: list[str] = []
    condition: str | None = None

    def close() -> None:
        if block:
            body = " ".join(block)
            statements.append(f"if ({condition} == 1) {{ {body} }}")
            block.clear()

    for gate in circuit.ops:
        text = statement_of(writer, gate, here, base)
        wanted = condition_of(writer, gate, base)
        if wanted != condition:
            close()
            condition = wanted
        (statements if condition is None else block).append(text)
    close()
    return statements


def condition_of(writer: Writer, gate: Op, base: int) -> str | None:
    """Return the bit that a gate waits for, as the file names it."""
    if gate.listens is not None:
        return writer.bit(gate.listens)
    if gate.condition is not None:
        return f"{writer.cleanup}[{base + gate.condition}]"
    return None


def statement_of(writer: Writer, gate: Op, here: Sequence[int], base: int) -> str:
    """Return the statement of one operation of a circuit at given sites."""
    qubits = [here[w] for w in gate.wires]
    if gate.name == "measure":
        return f"{writer.cleanup}[{base + (gate.bit or 0)}] = measure ${qubits[0]};"
    text, definition = gate_text(gate.name, gate.params, qubits)
    if definition:
        writer.used.add(definition)
    return text


def _staying(
    steps: Sequence[PlacedStep], sites: Mapping[str, int], program: Program
) -> tuple[frozenset[str], frozenset[str]]:
    """Return the wires that stay somewhere: unknown at the start, and in |0>.

    A wire that starts in |0> and has no step never stays anywhere.
    """
    used = {program.wire_names[w] for step in steps for w in step.operation.wires}
    inputs: set[str] = set()
    for wire, name in enumerate(program.wire_names):
        if name in sites and program.register_at(wire).start == "unknown":
            inputs.add(name)
    return frozenset(inputs), frozenset(used & set(sites) - inputs)


def _first_resets(needed: set[int], held: set[int]) -> list[str]:
    """Return the resets at the top: sites that must be |0> and hold no input."""
    chosen = sorted(needed - held)
    if not chosen:
        return []
    return [
        "// A physical qubit is undefined until its first reset.  These are taken as",
        "// |0> and hold no input, so they are prepared once here.  No reset is added",
        "// later: a reset of a qubit in use would be a measurement.",
        *(f"reset ${site};" for site in chosen),
    ]


def _site_of(program: Program, sites: Mapping[str, int], wire: int) -> int:
    name = program.wire_names[wire]
    if name not in sites:
        raise InputError.at(
            Place(program.path), "wire-not-placed", f"wire {name} has no site"
        )
    return sites[name]


def _declare(name: str, width: int) -> str:
    return f"bit[{width}] {name};" if width else f"bit {name};"


def _pragma(text: str) -> str:
    text = _one_line(text)
    is_whole = text.startswith(("pragma ", "#pragma "))
    return text.removeprefix("#") if is_whole else f"pragma {text}"


def annotation(text: str) -> str:
    """Return an annotation of the source on one line."""
    text = _one_line(text)
    return text if text.startswith("@") else f"@{text}"


def _one_line(text: str) -> str:
    return " ".join(text.split())


_LEVEL: Mapping[str, str] = {
    "toffoli": "Toffoli level",
    "clifford-t": "Clifford+T level",
}


def _level(gates: Gates) -> str:
    return _LEVEL[gates]
