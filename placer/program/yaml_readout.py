"""Measurements, resets and barriers in program YAML."""

from __future__ import annotations

from collections.abc import Sequence

from placer.errors import InputError
from placer.program.yaml_operand import operands
from placer.program.yaml_step import Steps
from placer.yamlnode import Node


def measure(steps: Steps, node: Node) -> None:
    """Measure qubits, into bits of the same number if there are any."""
    _refuse_in_compute(steps, "measure", node)
    source, target = node, None
    if node.is_mapping:
        entries = node.mapping(steps.faults, keys=("from", "into"), required=("from",))
        if not entries or "from" not in entries:
            return
        source, target = entries["from"], entries.get("into")
    wires = [w for operand in steps.plain(source) for w in operand.wires]
    bits: Sequence[str | None] = [None] * len(wires)
    if target is not None:
        bits = _target_bits(steps, target, len(wires))
    for wire, bit in zip(wires, bits, strict=True):
        steps.add("measure", (wire,), node.place, bit=bit)


def _target_bits(steps: Steps, node: Node, count: int) -> list[str]:
    numbers = {
        name: tuple(range(len(bits))) for name, bits in sorted(steps.bits.items())
    }
    result: list[str] = []
    for piece in node.items if node.is_sequence else (node,):
        for operand in operands(piece, numbers):
            name = piece.value.split("[")[0].split(".")[0].strip()
            result.extend(steps.bits[name][place] for place in operand.wires)
    if len(result) != count:
        raise InputError.at(
            node.place,
            "broadcast",
            f"the measurement gives {count} results, {node.label} takes {len(result)}",
        )
    return result


def reset(steps: Steps, node: Node) -> None:
    """Bring qubits to |0>."""
    _refuse_in_compute(steps, "reset", node)
    for operand in steps.plain(node):
        for wire in operand.wires:
            steps.add("reset", (wire,), node.place)


def barrier(steps: Steps, node: Node) -> None:
    """Order steps on some qubits, or on all that are in sight."""
    if node.is_scalar and node.value == "all":
        wires = sorted(wire for found in steps.names.values() for wire in found)
    else:
        wires = [w for operand in steps.plain(node) for w in operand.wires]
    steps.add("barrier", wires, node.place)


def _refuse_in_compute(steps: Steps, what: str, node: Node) -> None:
    if any(part == "compute" for _, part in steps.open):
        raise InputError.at(
            node.place,
            "not-invertible",
            f"'{what}' stands in a compute part and cannot be taken back",
            "move it into the body or out of the scope",
        )
