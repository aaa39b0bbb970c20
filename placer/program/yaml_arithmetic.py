"""Arithmetic calls in program YAML: sums, comparisons, steps, look-ups, products.

Registers are operands (`a`, `a[0:3]`), little-endian.  Each reader collects the wires
in the order of `Signature`, and leaves the judgement of the shape to it.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from types import MappingProxyType

from placer.errors import Fault, InputError
from placer.program.signature import Signature, problems
from placer.program.yaml_operand import operands
from placer.program.yaml_step import Steps
from placer.yamlnode import Node

LARGEST = (1 << 62) - 1
_OPTIONS = ("controls",)


def _register(steps: Steps, node: Node) -> tuple[int, ...]:
    return tuple(wire for part in steps.plain(node) for wire in part.wires)


def _number(node: Node) -> int | None:
    """Return the whole number of a node, `None` if it names a register."""
    if not node.is_scalar or not str(node.value).lstrip("+-").isdigit():
        return None
    faults: list[Fault] = []
    value = node.whole(faults, low=0, high=LARGEST)
    if faults:
        raise InputError(faults)
    return value


def _single(steps: Steps, node: Node) -> tuple[int, ...]:
    wires = _register(steps, node)
    if len(wires) != 1:
        raise InputError.at(
            node.place, "operand-count", f"{node.label} must be one qubit"
        )
    return wires


def _controls(
    steps: Steps, entries: Mapping[str, Node]
) -> tuple[tuple[int, ...], list[int]]:
    """Return the controls, and those of them that act on 0."""
    if "controls" not in entries:
        return (), []
    found = operands(entries["controls"], steps.names)
    wires = tuple(wire for part in found for wire in part.wires)
    zeros = [wire for part in found if part.on_zero for wire in part.wires]
    return wires, zeros


def _emit(
    steps: Steps,
    node: Node,
    entries: Mapping[str, Node],
    kind: str,
    registers: Sequence[tuple[int, ...]],
    *,
    result: tuple[int, ...] = (),
    constant: int | None = None,
    table: tuple[int, ...] = (),
    carry: bool = False,
    inverse: bool = False,
) -> None:
    controls, zeros = _controls(steps, entries)
    signature = Signature(
        kind,
        tuple(len(register) for register in registers),
        len(controls),
        constant,
        table,
        carry,
        inverse,
    )
    wrong = problems(signature)
    if wrong:
        raise InputError.at(node.place, "arithmetic-shape", "; ".join(wrong))
    wires = [*controls, *(w for register in registers for w in register), *result]
    for wire in sorted(set(zeros)):
        steps.add("gate", (wire,), node.place, name="x", is_frame=True)
    steps.add(kind, wires, node.place, signature=signature)  # type: ignore[arg-type]
    for wire in sorted(set(zeros)):
        steps.add("gate", (wire,), node.place, name="x", is_frame=True)


def _entries(
    steps: Steps, node: Node, required: Sequence[str], optional: Sequence[str] = ()
) -> Mapping[str, Node] | None:
    keys = (*required, *optional, *_OPTIONS)
    before = len(steps.faults)
    found = node.mapping(steps.faults, keys=keys, required=tuple(required))
    return found if len(steps.faults) == before else None


def _add(steps: Steps, node: Node, kind: str) -> None:
    entries = _entries(steps, node, ("value", "into"), ("carry",))
    if entries is None:
        return
    target = _register(steps, entries["into"])
    carry = _single(steps, entries["carry"]) if "carry" in entries else ()
    constant = _number(entries["value"])
    if constant is None:
        registers = [_register(steps, entries["value"]), target]
        _emit(steps, node, entries, kind, registers, result=carry, carry=bool(carry))
        return
    _emit(
        steps,
        node,
        entries,
        "add_constant",
        [target],
        result=carry,
        constant=constant,
        carry=bool(carry),
        inverse=kind == "subtract",
    )


def add(steps: Steps, node: Node) -> None:
    """Add a register or a number into a register."""
    _add(steps, node, "add")


def subtract(steps: Steps, node: Node) -> None:
    """Subtract a register or a number from a register."""
    _add(steps, node, "subtract")


def total(steps: Steps, node: Node) -> None:
    """Put the sum of two registers into a third one that is in |0>."""
    entries = _entries(steps, node, ("left", "right", "into"), ("carry",))
    if entries is None:
        return
    registers = [_register(steps, entries[key]) for key in ("left", "right", "into")]
    carry = _single(steps, entries["carry"]) if "carry" in entries else ()
    _emit(steps, node, entries, "sum", registers, result=carry, carry=bool(carry))


def _compare(steps: Steps, node: Node, kind: str) -> None:
    entries = _entries(steps, node, ("left", "right", "into"))
    if entries is None:
        return
    constant = _number(entries["right"])
    registers = [_register(steps, entries["left"])]
    if constant is None:
        registers.append(_register(steps, entries["right"]))
    result = _single(steps, entries["into"])
    _emit(steps, node, entries, kind, registers, result=result, constant=constant)


def less_than(steps: Steps, node: Node) -> None:
    """Flip a qubit where the left is less than the right."""
    _compare(steps, node, "less_than")


def equal(steps: Steps, node: Node) -> None:
    """Flip a qubit where the left equals the right."""
    _compare(steps, node, "equal")


def _step(steps: Steps, node: Node, kind: str) -> None:
    if not node.is_mapping:
        _emit(steps, node, {}, kind, [_register(steps, node)])
        return
    entries = _entries(steps, node, ("target",), ("carry",))
    if entries is None:
        return
    carry = _single(steps, entries["carry"]) if "carry" in entries else ()
    registers = [_register(steps, entries["target"])]
    _emit(steps, node, entries, kind, registers, result=carry, carry=bool(carry))


def increment(steps: Steps, node: Node) -> None:
    """Add 1 to a register."""
    _step(steps, node, "increment")


def decrement(steps: Steps, node: Node) -> None:
    """Subtract 1 from a register."""
    _step(steps, node, "decrement")


def lookup(steps: Steps, node: Node) -> None:
    """XOR the entry of a table that an address names into a register."""
    entries = _entries(steps, node, ("address", "into", "table"))
    if entries is None:
        return
    table = []
    for item in entries["table"].sequence(steps.faults) or ():
        value = item.whole(steps.faults, low=0, high=LARGEST)
        table.append(value or 0)
    registers = [_register(steps, entries[key]) for key in ("address", "into")]
    _emit(steps, node, entries, "lookup", registers, table=tuple(table))


def multiply_add(steps: Steps, node: Node) -> None:
    """Add the product of two registers into a third one."""
    entries = _entries(steps, node, ("left", "right", "into"))
    if entries is None:
        return
    registers = [_register(steps, entries[key]) for key in ("left", "right", "into")]
    _emit(steps, node, entries, "multiply_add", registers)


READERS: Mapping[str, Callable[[Steps, Node], None]] = MappingProxyType(
    {
        "add": add,
        "subtract": subtract,
        "sum": total,
        "less_than": less_than,
        "equal": equal,
        "increment": increment,
        "decrement": decrement,
        "lookup": lookup,
        "multiply_add": multiply_add,
    }
)
