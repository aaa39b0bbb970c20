"""Calls to test, their inputs, and what must come out, from the definition alone."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np
from arithmetic_simulators import Sparse

from placer.program.signature import (
    Signature,
    Values,
    apply,
    promised,
    value_widths,
)
from placer.recipes.arithmetic import recipe_names
from placer.recipes.circuit import Built

Case = tuple[str, Signature]


def table_of(entries: int, output: int) -> tuple[int, ...]:
    """Return a table without much structure, every output bit in use."""
    return tuple((5 * at * at + 3 * at + 1) % (1 << output) for at in range(entries))


def signatures(size: int, controls: int) -> Iterator[Signature]:
    """Return signatures of every kind with registers of this width."""
    one, two = (size,), (size, size)
    for inverse in (False, True):
        for carry in (False, True):
            for kind in ("add", "subtract"):
                yield Signature(kind, two, controls, carry=carry, inverse=inverse)
            for kind in ("increment", "decrement"):
                yield Signature(kind, one, controls, carry=carry, inverse=inverse)
            three = (size, size, size)
            yield Signature("sum", three, controls, carry=carry, inverse=inverse)
            for constant in range(1 << size):
                yield Signature(
                    "add_constant", one, controls, constant, (), carry, inverse
                )
    for kind in ("less_than", "equal"):
        yield Signature(kind, two, controls)
        for constant in range((1 << size) + (kind == "less_than")):
            yield Signature(kind, one, controls, constant)


def lookup_signatures(address: int, output: int, controls: int) -> Iterator[Signature]:
    """Return look-ups of tables that need all address wires, or fewer."""
    for entries in range(1, (1 << address) + 1):
        table = table_of(entries, output)
        for inverse in (False, True):
            yield Signature(
                "lookup",
                (address, output),
                controls,
                table=table,
                inverse=inverse,
            )


def product_signatures(most: int, controls: int) -> Iterator[Signature]:
    """Return products of registers of different widths."""
    for first in range(1, most + 1):
        for second in range(1, most + 1):
            for target in range(1, most + 3):
                for inverse in (False, True):
                    widths = (first, second, target)
                    yield Signature("multiply_add", widths, controls, inverse=inverse)


def cases(wanted: Iterable[Signature]) -> list[Case]:
    """Return every recipe of every signature."""
    return [(name, asked) for asked in wanted for name in recipe_names(asked)]


# ------------------------------------------------------------------ integers and bits
def free_wires(built: Built) -> list[int]:
    """Return the operands and the borrowed wires: those that may hold anything."""
    first = built.fine.operands
    lent = [first + at for at, slot in enumerate(built.slots) if slot == "borrowed"]
    return [*range(first), *lent]


def split(signature: Signature, label: int) -> Values:
    """Return the integers that a label of the operand wires stands for."""
    values = []
    for width in value_widths(signature):
        values.append(label & ((1 << width) - 1))
        label >>= width
    return tuple(values)


def merge(signature: Signature, values: Values) -> int:
    """Return the label of the operand wires that hold these integers."""
    label, at = 0, 0
    for value, width in zip(values, value_widths(signature), strict=True):
        assert 0 <= value < 1 << width
        label |= value << at
        at += width
    return label


def every_operand(signature: Signature) -> list[int]:
    """Return the labels of all operand values that keep the promises."""
    every = range(1 << signature.operands)
    return [label for label in every if promised(signature, split(signature, label))]


def expected(signature: Signature, labels: Iterable[int]) -> list[int]:
    """Return what the operand wires must hold afterwards."""
    return [merge(signature, apply(signature, split(signature, x))) for x in labels]


def bits_of(labels: list[int], width: int) -> np.ndarray:
    """Return labels as a boolean matrix, wires x inputs."""
    size = -(-width // 8)
    octets = b"".join(label.to_bytes(size, "little") for label in labels)
    rows = np.frombuffer(octets, dtype=np.uint8).reshape(len(labels), size)
    return np.unpackbits(rows, axis=1, bitorder="little")[:, :width].T.astype(bool)


def all_inputs(built: Built, signature: Signature) -> tuple[list[int], list[int]]:
    """Return every allowed input with all borrowed values, and what must come out."""
    before = every_operand(signature)
    after = expected(signature, before)
    lent = [wire for wire in free_wires(built) if wire >= signature.operands]
    spread = [0]
    for wire in lent:
        spread += [label | 1 << wire for label in spread]
    return (
        [label | extra for extra in spread for label in before],
        [label | extra for extra in spread for label in after],
    )


def some_operands(signature: Signature, count: int, seed: int) -> list[Values]:
    """Return random operands that keep the promises, with many extreme ones.

    Long carries are rare in uniform numbers; half of the inputs therefore come from
    runs of equal bits, or as complements of one another.
    """
    rng = np.random.default_rng(seed)
    found: list[Values] = []
    for at in range(count):
        numbers = [
            _number(rng, width, runs=at % 2 == 1) for width in value_widths(signature)
        ]
        if signature.controls and at % 4:
            numbers[: signature.controls] = [1] * signature.controls
        registers = signature.controls
        if at % 8 == 3 and len(set(signature.widths[:2])) == 1:
            if len(signature.widths) > 1:
                top = (1 << signature.widths[0]) - 1
                numbers[registers + 1] = numbers[registers] ^ top
        elif at % 8 == 5 and signature.constant is not None:
            top = (1 << signature.widths[0]) - 1
            near = signature.constant + int(rng.integers(-1, 2))
            numbers[registers] = (near if at % 16 == 5 else ~near) & top
        found.append(_promise(signature, numbers))
    return found


def _number(rng: np.random.Generator, width: int, *, runs: bool) -> int:
    if not runs:
        return int.from_bytes(rng.bytes(-(-width // 8)), "little") % (1 << width)
    value = 0
    for cut in rng.integers(0, width + 1, size=int(rng.integers(1, 4))):
        value ^= (1 << int(cut)) - 1
    return value


def _promise(signature: Signature, numbers: list[int]) -> Values:
    at = signature.controls
    active = all(numbers[:at])
    if signature.kind == "sum":
        whole = (numbers[at] + numbers[at + 1]) * (signature.inverse and active)
        numbers[at + 2] = whole % (1 << signature.width)
        if signature.carry:
            numbers[at + 3] = whole >> signature.width
    if signature.kind == "lookup":
        numbers[at] %= len(signature.table)
        if signature.inverse:
            numbers[at + 1] = signature.table[numbers[at]] if active else 0
    return tuple(numbers)


def superposed(labels: list[int], seed: int) -> Sparse:
    """Return random amplitudes on some labels."""
    rng = np.random.default_rng(seed)
    amps = rng.normal(size=len(labels)) + 1j * rng.normal(size=len(labels))
    return np.array(labels, dtype=np.int64), amps / np.linalg.norm(amps)
