"""Which of two steps comes first: known from shared wires, else a literal."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from ortools.sat.python import cp_model


class Order:
    """Literals 'step i ends before step j starts', made when first asked for."""

    def __init__(
        self,
        model: cp_model.CpModel,
        operands: Sequence[Sequence[int]],
        start: Sequence[Any],
        end: Sequence[Any],
    ) -> None:
        self.model = model
        self.start = start
        self.end = end
        self.after = _closure(operands)
        self.literals: dict[tuple[int, int], Any] = {}
        self.true = model.new_constant(1)
        self.false = model.new_constant(0)

    def is_known(self, i: int, j: int) -> bool:
        """Whether the program itself orders the two steps."""
        return bool(self.after[i] >> j & 1 or self.after[j] >> i & 1)

    def before(self, i: int, j: int) -> Any:
        """Return the literal that step i ends before step j starts."""
        if i == j or self.after[j] >> i & 1:
            return self.false
        if self.after[i] >> j & 1:
            return self.true
        if (i, j) not in self.literals:
            literal = self.model.new_bool_var(f"before[{i},{j}]")
            self.model.add(self.end[i] <= self.start[j]).only_enforce_if(literal)
            self.literals[i, j] = literal
            if (j, i) in self.literals:
                self.model.add_bool_or(~literal, ~self.literals[j, i])
        return self.literals[i, j]


def _closure(operands: Sequence[Sequence[int]]) -> list[int]:
    """Return per step the bit set of steps that must come after it."""
    after = [0] * len(operands)
    next_use: dict[int, int] = {}
    for i in range(len(operands) - 1, -1, -1):
        for wire in operands[i]:
            if wire in next_use:
                j = next_use[wire]
                after[i] |= after[j] | 1 << j
            next_use[wire] = i
    return after
