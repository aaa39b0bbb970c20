"""Prices as layered literals: 'dearer than the k-th distinct value'.

A price that depends on where one or two things sit becomes a constant (the least
value) plus, for each further distinct value, a literal that must hold as soon as the
chosen sites cost at least that much.  No product of literals is needed, and the
solver's bound rises with the layers (measured best among five formulations).
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from ortools.sat.python import cp_model

Layer = tuple[int, int, Any]
"""(price step, distance step, literal); the first layer's literal is a constant."""

Values = dict[tuple[int, int], tuple[int, int] | None]
"""(price, distance) per pair of sites; `None` where no fitting link is in reach."""


@dataclass(frozen=True, slots=True)
class Prices:
    """Price and distance matrices for one kind of gate; `far` marks out of reach."""

    price: Any
    away: Any
    far: int

    def between(self, a: Mapping[int, Any], b: Mapping[int, Any]) -> Values:
        """Return the values for the sites that two things may take."""
        result: Values = {}
        for p in a:
            for q in b:
                if p != q:
                    distance = int(self.away[p, q])
                    near = distance < self.far
                    result[p, q] = (int(self.price[p, q]), distance) if near else None
        return result


class Charges:
    """Collect the terms of the objective while the model is built."""

    def __init__(self, model: cp_model.CpModel) -> None:
        self.model = model
        self.constant = 0
        self.terms: list[tuple[int, Any]] = []
        self.true = model.new_constant(1)
        self._shared: dict[tuple[int, int, int], list[Layer]] = {}

    def add(self, weight: int, literal: Any) -> None:
        """Charge a weight when a literal holds."""
        if weight:
            self.terms.append((weight, literal))

    def site(
        self, guard: Any, at: Mapping[int, Any], values: Mapping[int, int]
    ) -> None:
        """Charge `values[p]` for the site p that holds, if the guard holds.

        Sites without a value are forbidden elsewhere.
        """
        levels = sorted(set(values.values()))
        if not levels:
            return
        if guard is None:
            self.constant += levels[0]
        else:
            self.add(levels[0], guard)
        for low, high in itertools.pairwise(levels):
            literal = self.model.new_bool_var("")
            self.add(high - low, literal)
            for p in sorted(values):
                if values[p] >= high:
                    clause = [~at[p], literal]
                    if guard is not None:
                        clause.append(~guard)
                    self.model.add_bool_or(clause)

    def rate(
        self, at: Mapping[int, Any], rates: Mapping[int, int], time: Any, most: int
    ) -> None:
        """Charge `rates[p]` times a time variable for the site p that holds."""
        levels = sorted(set(rates.values()))
        if not levels:
            return
        self.add(levels[0], time)
        for low, high in itertools.pairwise(levels):
            part = self.model.new_int_var(0, most, "")
            self.add(high - low, part)
            for p in sorted(rates):
                if rates[p] >= high:
                    self.model.add(part >= time).only_enforce_if(at[p])

    def pair(
        self,
        guard: Any,
        a: Mapping[int, Any],
        b: Mapping[int, Any],
        prices: Prices,
        *,
        is_shared: bool,
    ) -> list[Layer]:
        """Return the layers of the price and distance between two things.

        Shared layers (of two wires) serve every step; a guarded use of them gets the
        product of each layer's literal and the guard.
        """
        values = prices.between(a, b)
        if not is_shared:
            self._forbid(guard, a, b, values)
            return self._layers(guard, a, b, values)
        key = (id(a), id(b), id(prices))
        if key not in self._shared:
            self._shared[key] = self._layers(None, a, b, values)
        self._forbid(guard, a, b, values)
        if guard is None:
            return self._shared[key]
        return [
            (step, distance, self._product(guard, literal))
            for step, distance, literal in self._shared[key]
        ]

    def _product(self, guard: Any, literal: Any) -> Any:
        if literal is self.true:
            return guard
        both = self.model.new_bool_var("")
        self.model.add_bool_or(~guard, ~literal, both)
        return both

    def _forbid(
        self, guard: Any, a: Mapping[int, Any], b: Mapping[int, Any], values: Values
    ) -> None:
        """Forbid pairs of sites that no fitting link can bring together."""
        if any(value is None for value in values.values()):
            otherwise = [] if guard is None else [~guard]
            self._clauses(a, b, lambda p, q: values[p, q] is not None, otherwise)

    def _layers(
        self, guard: Any, a: Mapping[int, Any], b: Mapping[int, Any], values: Values
    ) -> list[Layer]:
        reachable = sorted({value for value in values.values() if value is not None})
        if not reachable:
            return []
        prices = sorted({price for price, _ in reachable})
        aways = sorted({away for _, away in reachable})
        is_chain = all(
            low[1] <= high[1] for low, high in itertools.pairwise(reachable)
        ) and len(prices) == len(reachable)
        if is_chain:
            # The dearer pair is never the nearer one: one set of layers serves both.
            layers = self._axis(guard, a, b, values, prices, 0)
            steps = [reachable[0][1]] + [
                high[1] - low[1] for low, high in itertools.pairwise(reachable)
            ]
            return [
                (price, distance, literal)
                for (price, literal), distance in zip(layers, steps, strict=True)
            ]
        result = [
            (amount, 0, literal)
            for amount, literal in self._axis(guard, a, b, values, prices, 0)
        ]
        result += [
            (0, amount, literal)
            for amount, literal in self._axis(guard, a, b, values, aways, 1)
        ]
        return result

    def _axis(
        self,
        guard: Any,
        a: Mapping[int, Any],
        b: Mapping[int, Any],
        values: Values,
        levels: list[int],
        axis: int,
    ) -> list[tuple[int, Any]]:
        layers = [(levels[0], self.true if guard is None else guard)]
        open_end = [] if guard is None else [~guard]
        for low, high in itertools.pairwise(levels):
            literal = self.model.new_bool_var("")
            layers.append((high - low, literal))

            def is_near(p: int, q: int, high: int = high) -> bool:
                value = values[p, q]
                return value is not None and value[axis] < high

            self._clauses(a, b, is_near, [*open_end, literal])
        return layers

    def _clauses(
        self,
        a: Mapping[int, Any],
        b: Mapping[int, Any],
        is_near: Callable[[int, int], bool],
        otherwise: list[Any],
    ) -> None:
        for p in sorted(a):
            near = [b[q] for q in sorted(b) if q != p and is_near(p, q)]
            if len(near) < len(b) - (p in b):
                self.model.add_bool_or([~a[p], *near, *otherwise])
        for q in sorted(b):
            near = [a[p] for p in sorted(a) if p != q and is_near(p, q)]
            if len(near) < len(a) - (q in a):
                self.model.add_bool_or([~b[q], *near, *otherwise])
