"""Calls in program YAML: mcx, mcz, mcp and the product `and`."""

from __future__ import annotations

from placer.errors import InputError, Place
from placer.program.lowering import lower
from placer.program.terms import Term
from placer.program.yaml_operand import angle, operands
from placer.program.yaml_step import Steps
from placer.yamlnode import Node


def _call(steps: Steps, base: str, node: Node, target_key: str) -> None:
    """Read a call: controls and a target, or for phases just the qubits `on`."""
    keys = ["controls", target_key]
    if base == "p":
        keys.append("angle")
    if base in ("z", "p"):
        keys.append("on")
    entries = node.mapping(steps.faults, keys=keys)
    if entries is None:
        return
    params: tuple[float, ...] = ()
    if base == "p":
        if "angle" not in entries:
            raise InputError.at(
                node.place, "missing-key", f"{node.label} needs the key 'angle'"
            )
        params = (angle(entries["angle"]),)
    wires, zeros = _call_wires(steps, entries, target_key, node)
    _emit(steps, base, params, wires, zeros, node.place)


def _call_wires(
    steps: Steps, entries: dict[str, Node], target_key: str, node: Node
) -> tuple[list[int], list[int]]:
    """Return controls and target, and the wires that act on 0."""
    if "on" in entries:
        if len({"controls", target_key} & set(entries)) > 0:
            raise InputError.at(
                node.place,
                "step",
                f"{node.label} has 'on' as well as controls or a target",
                "keep one of the two forms",
            )
        controls, target = operands(entries["on"], steps.names), []
    else:
        for key in ("controls", target_key):
            if key not in entries:
                raise InputError.at(
                    node.place, "missing-key", f"{node.label} needs the key '{key}'"
                )
        controls = operands(entries["controls"], steps.names)
        target = steps.plain(entries[target_key])
        if sum(len(operand.wires) for operand in target) != 1:
            raise InputError.at(
                entries[target_key].place,
                "operand-count",
                f"the {target_key} of {node.label} must be one qubit",
            )
    both = [*controls, *target]
    wires = [wire for operand in both for wire in operand.wires]
    zeros = [wire for operand in both if operand.on_zero for wire in operand.wires]
    return wires, zeros


def _emit(
    steps: Steps,
    base: str,
    params: tuple[float, ...],
    wires: list[int],
    zeros: list[int],
    place: Place,
) -> None:
    if len(wires) < 2:
        raise InputError.at(place, "operand-count", "a call needs a control")
    for wire in sorted(set(zeros)):
        steps.add("gate", (wire,), place, name="x", is_frame=True)
    if base == "and":
        steps.add("and", wires, place)
    else:
        places = tuple(range(len(wires)))
        term = Term(base, params, places[:-1], places[-1:])
        for raw in lower((term,)):
            local = [wires[i] for i in raw.wires]
            steps.add(raw.kind, local, place, name=raw.name, params=raw.params)
    for wire in sorted(set(zeros)):
        steps.add("gate", (wire,), place, name="x", is_frame=True)


def mcx(steps: Steps, node: Node) -> None:
    """Flip a target where all controls are 1."""
    _call(steps, "x", node, "target")


def mcz(steps: Steps, node: Node) -> None:
    """Change the sign where all qubits are 1."""
    _call(steps, "z", node, "target")


def mcp(steps: Steps, node: Node) -> None:
    """Give a phase where all qubits are 1."""
    _call(steps, "p", node, "target")


def product(steps: Steps, node: Node) -> None:
    """Compute the product of at least two qubits into workspace."""
    entries = node.mapping(
        steps.faults, keys=("controls", "into"), required=("controls", "into")
    )
    if entries is None or len(entries) < 2:
        return
    wires, zeros = _call_wires(steps, entries, "into", node)
    if len(wires) < 3:
        raise InputError.at(
            entries["controls"].place,
            "operand-count",
            f"'and' needs at least two controls, found {len(wires) - 1}",
            "copy one qubit with cx",
        )
    _need_workspace(steps, wires[-1], entries["into"])
    _emit(steps, "and", (), wires, zeros, node.place)


def _need_workspace(steps: Steps, wire: int, node: Node) -> None:
    """Refuse an `and` that no scope takes back, or into a wire with a value."""
    if wire not in steps.owners:
        raise InputError.at(
            node.place,
            "and-target",
            f"the target {node.shown} of 'and' is not workspace",
            "use workspace of a scope, or mcx for any other wire",
        )
    owner = steps.owners[wire]
    inside = [number for number, _ in steps.open]
    start = inside.index(owner) if owner in inside else 0
    if not any(part == "compute" for _, part in steps.open[start:]):
        raise InputError.at(
            node.place,
            "and-outside",
            "'and' stands outside of a compute part, so that nothing takes it back",
            "move it into the compute part of a scope",
        )
