"""Replay the whole placed circuit on bits, many random inputs at once.

In: a case.  Out: findings where the placed steps compute something else than the
program, or where workspace is not what its lease says.  64 inputs ride in a word.

A gate that branches (h, rx, ...) puts fresh random bits on its target, the same ones
in the program and in the placed circuit: a state is a sum over paths, one per choice
of those bits, and the two circuits agree if they agree along every path.  Phases are
not seen here; `simulate` compares those, recipe by recipe.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from placer.check import simulate

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.check.case import Case, Planned
    from placer.program.model import Operation
    from placer.recipes.circuit import Built

    Words = NDArray[np.uint64]

WORDS = 4
CLASSICAL = {"x", "cx", "ccx", "swap", "mcx"}
BRANCHING = {"h", "sx", "sxdg", "rx", "ry", "u", "ch", "crx", "cry", "rxx"}


class Replay:
    """Program and placed circuit side by side on the same random inputs."""

    def __init__(self, case: Case, seed: int) -> None:
        self.case = case
        self.seed = seed
        draw = np.random.default_rng(seed)
        self.sites: dict[int, Words] = {s.id: _random(draw) for s in case.device.sites}
        self.wires: list[Words] = []
        self.begun: set[int] = set()
        for w in range(len(case.program.wire_names)):
            register = case.program.register_at(w)
            bits = _random(draw)
            # Some inputs all on: products of many controls are rarely 1 by chance.
            bits[0] = np.uint64(2**64 - 1) if WORDS > 1 else bits[0]
            bits[1] |= _random(draw)[1] | _random(draw)[1]
            if register.start == "zero" or register.workspace:
                bits = np.zeros(WORDS, dtype=np.uint64)
            self.wires.append(bits)
            if register.start != "zero" and not register.workspace:
                self.sites[case.sites[w]] = bits.copy()
                self.begun.add(w)
        self.fresh: set[int] = {s.id for s in case.device.sites}
        self.fresh -= {case.sites[w] for w in self.begun}
        for site in self.fresh:
            self.sites[site] = np.zeros(WORDS, dtype=np.uint64)

    def check(self) -> None:
        """Replay every step in placed order."""
        done: set[int] = set()
        for step in self.case.order():
            for wire in step.op.wires:
                if wire not in self.begun:
                    self._begin(wire, step)
            self._step(step)
            done.add(step.op.index)
            if len(self.case.findings) > 20:
                return
        names = self.case.program.wire_names
        for w in sorted(self.begun):
            register = self.case.program.register_at(w)
            site = self.case.sites[w]
            if register.workspace:
                if self.wires[w].any():
                    text = "the program leaves this workspace other than |0>"
                    self.case.find("slot-not-returned", names[w], text)
            elif not np.array_equal(self.wires[w], self.sites[site]):
                text = f"site {site} ends with another value than the program gives"
                self.case.find("function-differs", names[w], text)

    def _begin(self, w: int, step: Planned) -> None:
        self.begun.add(w)
        site = self.case.sites[w]
        if self.sites[site].any():
            name = self.case.program.wire_names[w]
            text = f"site {site} is not in |0> when wire {name} begins"
            self.case.find("slot-not-clean", step.label, text)

    def _step(self, step: Planned) -> None:
        before = {one.site: self.sites[one.site].copy() for one in step.leases}
        for lease in step.leases:
            if lease.kind == "clean" and before[lease.site].any():
                text = f"site {lease.site} is leased as clean and is not in |0>"
                self.case.find(
                    "slot-not-clean", f"{step.label}, slot {lease.slot}", text
                )
        self._program(step.op)
        self._placed(step)
        for w in step.op.wires:
            if not np.array_equal(self.wires[w], self.sites[self.case.sites[w]]):
                name = self.case.program.wire_names[w]
                text = f"wire {name} on site {self.case.sites[w]} differs after it"
                self.case.find("function-differs", step.label, text)
                self.sites[self.case.sites[w]] = self.wires[w].copy()
        for lease in step.leases:
            if np.array_equal(self.sites[lease.site], before[lease.site]):
                continue
            label = f"{step.label}, slot {lease.slot}"
            if lease.kind == "clean":
                text = f"site {lease.site} is not back in |0>"
                self.case.find("slot-not-returned", label, text)
            else:
                text = f"borrowed site {lease.site} does not come back unchanged"
                self.case.find("borrowed-changed", label, text)

    def _program(self, op: Operation) -> None:
        """Do a step as the program means it."""
        wires = [self.wires[w] for w in op.wires]
        if op.kind in ("mcx", "and"):
            wires[-1] ^= np.bitwise_and.reduce(wires[:-1])
        elif op.kind == "reset":
            wires[0][:] = 0
        elif op.kind == "gate":
            self._gate(op, wires)

    def _placed(self, step: Planned) -> None:
        """Do a step as placed: its coarse circuit where that is made of bits."""
        if step.op.kind == "reset":
            self.sites[step.where[0]][:] = 0
            return
        words = [self.sites[p] for p in step.where]
        if step.op.kind == "gate":
            self._gate(step.op, words)
            return
        ops = step.built.coarse.ops
        if is_classical(step.built):
            for op in ops:
                local = [words[w] for w in op.wires]
                if op.name == "swap":
                    both = local[0].copy()
                    local[0][:] = local[1]
                    local[1][:] = both
                elif op.name in CLASSICAL:
                    if len(local) == 1:
                        local[0] ^= np.uint64(2**64 - 1)
                    else:
                        local[-1] ^= np.bitwise_and.reduce(local[:-1])
        elif step.op.kind in ("mcx", "and"):
            # Its inner branches are followed by `simulate`; here it counts as done.
            operands = words[: step.built.coarse.operands]
            operands[-1] ^= np.bitwise_and.reduce(operands[:-1])

    def _gate(self, op: Operation, words: list[Words]) -> None:
        if op.name in ("x", "y"):
            words[0] ^= np.uint64(2**64 - 1)
        elif op.name in ("cx", "cy"):
            words[1] ^= words[0]
        elif op.name == "swap":
            both = words[0].copy()
            words[0][:] = words[1]
            words[1][:] = both
        elif op.name in BRANCHING:
            draw = np.random.default_rng([self.seed, op.index])
            targets = words if op.name == "rxx" else words[-1:]
            for word in targets:
                word[:] = _random(draw)


def is_classical(built: Built) -> bool:
    """Whether a coarse circuit consists of permutations of bits alone."""
    return all(op.name in CLASSICAL and op.condition is None for op in built.coarse.ops)


def check_recipes(case: Case, seed: int) -> list[str]:
    """Verify each distinct recipe's fine circuit, phases included; return notes."""
    notes: list[str] = []
    seen: set[tuple[object, ...]] = set()
    for step in case.steps:
        op = step.op
        key = (step.built.recipe, op.kind, op.controls, op.params, op.inverse)
        if not op.is_call or key in seen:
            continue
        seen.add(key)
        angle = op.params[0] if op.params else 0.0
        try:
            found = simulate.differences(
                step.built, angle, inverse=op.inverse, seed=seed
            )
        except simulate.TooWide:
            notes.append(
                f"'{step.built.recipe}' with {op.controls} controls branches too much "
                "for exact simulation; replayed on bits only"
            )
            continue
        for text in found:
            case.find("function-differs", step.label, f"'{step.built.recipe}': {text}")
    return notes


def _random(draw: np.random.Generator) -> Words:
    return draw.integers(0, 2**64, WORDS, dtype=np.uint64)
