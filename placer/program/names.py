"""Names of a program and what they stand for, in nested blocks.

Gates live in a table of their own, since files name registers `t` or `x` as well.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from placer.errors import InputError, Place, did_you_mean
from placer.program.expression import CONSTANTS, evaluate
from placer.program.syntax import Expression, Index, Number, Operand, Several, Slice

LARGEST_REGISTER = 1_000_000


class Silent(InputError):  # noqa: N818 - not shown to anybody
    """A fault that follows from one already reported; carries none of its own."""

    def __init__(self) -> None:
        super().__init__(())


@dataclass(frozen=True, slots=True)
class Wires:
    """A quantum register, a part of one, or an alias."""

    wires: tuple[int, ...]
    is_single: bool
    what: str = "a quantum register"


@dataclass(frozen=True, slots=True)
class Bits:
    """A classical register or a part of one; bits are named as in the source."""

    bits: tuple[str, ...]
    is_single: bool
    what: str = "a classical register"


@dataclass(frozen=True, slots=True)
class Constant:
    """A number known while reading."""

    value: Number
    what: str = "a constant"


@dataclass(frozen=True, slots=True)
class Broken:
    """A name whose declaration was refused."""

    what: str = "a name"


Entity = Wires | Bits | Constant | Broken


@dataclass(slots=True)
class Names:
    """The names in sight, innermost block last."""

    dialect: str
    blocks: list[dict[str, tuple[Entity, Place]]] = field(default_factory=lambda: [{}])
    turns: int = 0

    def declare(self, name: str, entity: Entity, place: Place) -> None:
        """Give a name a meaning in the innermost block."""
        block = self.blocks[-1]
        if name in CONSTANTS:
            raise InputError.at(
                place, "keyword", f"'{name}' is a constant of the language"
            )
        if name in block:
            known, before = block[name]
            if isinstance(known, Broken) or isinstance(entity, Broken):
                return
            raise InputError.at(
                place,
                "declared-twice",
                f"'{name}' is declared already, as {known.what} in line {before.line}",
                "choose another name",
            )
        block[name] = (entity, place)

    def find(self, name: str, place: Place, what: str) -> Entity:
        """Return the meaning of a name."""
        for block in reversed(self.blocks):
            if name in block:
                entity = block[name][0]
                if isinstance(entity, Broken):
                    raise Silent
                return entity
        known = sorted({word for block in self.blocks for word in block})
        # Report a missing name once, not at every use.
        self.blocks[0][name] = (Broken(), place)
        raise InputError.at(
            place,
            "undeclared",
            f"{what} '{name}' is not declared",
            did_you_mean(name, known),
        )

    def value(self, expression: Expression) -> Number:
        """Return the value of a constant expression."""
        return evaluate(expression, self._constant, self.dialect)

    def whole(self, expression: Expression, what: str) -> int:
        """Return the value of a constant expression that must be a whole number."""
        value = self.value(expression)
        if isinstance(value, float):
            raise InputError.at(
                expression[-1].place,
                "not-whole",
                f"{what} is {value:g}, not a whole number",
            )
        return value

    def size(self, expression: Expression | None, name: str) -> int:
        """Return the size of a register; 1 for a single one."""
        if expression is None:
            return 1
        size = self.whole(expression, f"the size of '{name}'")
        if not 1 <= size <= LARGEST_REGISTER:
            raise InputError.at(
                expression[-1].place,
                "bad-size",
                f"the size of '{name}' is {size:g}, must be 1 to {LARGEST_REGISTER}",
            )
        return size

    def _constant(self, name: str, place: Place) -> Number:
        entity = self.find(name, place, "the constant")
        if not isinstance(entity, Constant):
            raise InputError.at(
                place, "not-constant", f"'{name}' is {entity.what}, not a constant"
            )
        return entity.value

    def wires(self, operand: Operand) -> Wires:
        """Return the wires that an operand names."""
        if operand.name.startswith("$"):
            raise InputError.at(
                operand.place,
                "unsupported",
                f"physical qubits such as '{operand.name}' are not supported",
                "declare a quantum register; the plan chooses the sites",
            )
        entity = self.find(operand.name, operand.place, "the qubit or register")
        if not isinstance(entity, Wires):
            raise InputError.at(
                operand.place,
                "wrong-kind",
                f"'{operand.name}' is {entity.what}, expected a quantum register",
            )
        if not operand.indices:
            return entity
        places, is_single = self._chosen(operand, len(entity.wires), entity.is_single)
        return Wires(tuple(entity.wires[place] for place in places), is_single)

    def bits(self, operand: Operand) -> Bits:
        """Return the bits that an operand names."""
        entity = self.find(operand.name, operand.place, "the bit or register")
        if not isinstance(entity, Bits):
            raise InputError.at(
                operand.place,
                "wrong-kind",
                f"'{operand.name}' is {entity.what}, expected a classical register",
            )
        if not operand.indices:
            return entity
        places, is_single = self._chosen(operand, len(entity.bits), entity.is_single)
        return Bits(tuple(entity.bits[place] for place in places), is_single)

    def _chosen(
        self, operand: Operand, width: int, is_single: bool
    ) -> tuple[tuple[int, ...], bool]:
        """Return the positions that the indices of an operand choose."""
        positions = tuple(range(width))
        for index in operand.indices:
            if is_single:
                raise InputError.at(
                    operand.place,
                    "index",
                    f"'{operand.name}' is single and takes no index",
                )
            chosen, is_single = self._index(index, len(positions), operand)
            positions = tuple(positions[place] for place in chosen)
        return positions, is_single

    def _index(
        self, index: Index, width: int, operand: Operand
    ) -> tuple[list[int], bool]:
        if isinstance(index, Slice):
            return self._slice(index, width, operand), False
        if isinstance(index, Several):
            members = [self._position(each, width, operand) for each in index.members]
            return members, False
        return [self._position(index, width, operand)], True

    def _position(self, expression: Expression, width: int, operand: Operand) -> int:
        value = self.whole(expression, f"the index of '{operand.name}'")
        return self._in_range(value, width, operand)

    def _in_range(self, value: int, width: int, operand: Operand) -> int:
        least = 0 if self.dialect == "openqasm2" else -width
        if not least <= value < width:
            raise InputError.at(
                operand.place,
                "index",
                f"{operand.name}[{value}] does not exist: '{operand.name}' has size "
                f"{width}",
                f"use an index from 0 to {width - 1}",
            )
        return value % width

    def _slice(self, index: Slice, width: int, operand: Operand) -> list[int]:
        step = 1 if index.step is None else self.whole(index.step, "the step")
        first, last = (0, width - 1) if step > 0 else (width - 1, 0)
        if index.start is not None:
            first = self._position(index.start, width, operand)
        if index.stop is not None:
            last = self._position(index.stop, width, operand)
        return self.range(first, step, last, index.place)

    def range(self, first: int, step: int, last: int, place: Place) -> list[int]:
        """Return the members of a range that holds both its ends."""
        if step == 0:
            raise InputError.at(place, "bad-range", "the step of a range is 0")
        values = range(first, last + (1 if step > 0 else -1), step)
        if not values:
            raise InputError.at(
                place, "bad-range", f"the range [{first}:{step}:{last}] is empty"
            )
        if abs(last - first) // abs(step) >= LARGEST_REGISTER:
            raise InputError.at(
                place,
                "too-large",
                f"the range [{first}:{step}:{last}] has more than "
                f"{LARGEST_REGISTER} members",
            )
        return list(values)
