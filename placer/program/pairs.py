"""Statements of OpenQASM that are a compute part and its cleanup: `@placer.compute`.

In: annotated statements and the steps they gave.  Out: scopes.  The second statement
must undo the first step by step, and nothing in between may change what it used; what
fails is refused with both lines.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

from placer.errors import Fault, InputError, Place
from placer.program.annotation import PAIRED, arguments_of, is_own, word_of
from placer.program.draft import Draft, DraftScope, Part, Step
from placer.program.roles import written
from placer.program.syntax import Annotation
from placer.program.yaml_scope import body_faults, inverse_step

_CLOSE = 1e-12  # radians


@dataclass(slots=True)
class _Open:
    """A pair whose second statement is still to come."""

    name: str
    number: int
    place: Place
    part: Part = "compute"


@dataclass(slots=True)
class Pairs:
    """The pairs of a program; `open` is a stack, the innermost last.

    `scratch_of` returns the wires of a register that is named as scratch.  `cleaned`
    says for scratch that nothing has been written to since where that was done.
    """

    draft: Draft
    scratch_of: Callable[[str, Place], Sequence[int]]
    open: list[_Open] = field(default_factory=list)
    names: dict[str, Place] = field(default_factory=dict)
    cleaned: dict[int, Place] = field(default_factory=dict)

    def begin(self, notes: Sequence[Annotation]) -> _Open | None:
        """Open a pair, or come to the second statement of the innermost one.

        Raises
        ------
        InputError
            If the annotation is wrong or belongs to no pair that is open.
        """
        own = [note for note in notes if is_own(note) and word_of(note) in PAIRED]
        if not own:
            return None
        if len(own) > 1:
            raise InputError.at(
                own[1].place,
                "annotation-twice",
                "a statement can be one half of one pair only",
            )
        (note,) = own
        given = arguments_of(note, required=("id",), optional=("scratch",))
        if word_of(note) == "compute":
            return self._first(note, given)
        if not self.open or self.open[-1].name != given["id"]:
            raise InputError.at(
                note.place,
                "pair-order",
                f"'@placer.uncompute id={given['id']}' ends no pair that is open here",
                self._expected(given["id"]),
            )
        self.open[-1].part = "cleanup"
        return self.open[-1]

    def _expected(self, name: str) -> str:
        if self.open:
            inner = self.open[-1]
            return f"first end the pair '{inner.name}' of line {inner.place.line}"
        if name in self.names:
            return f"the pair of line {self.names[name].line} is over"
        return f"write '@placer.compute id={name}' before the statement it undoes"

    def _first(self, note: Annotation, given: dict[str, str]) -> _Open:
        name = given["id"]
        if name in self.names:
            raise InputError.at(
                note.place,
                "declared-twice",
                f"there is a pair '{name}' in line {self.names[name].line} already",
                "choose another id",
            )
        if "scratch" in given:
            self.scratch_of(given["scratch"], note.place)
        self.names[name] = note.place
        number = len(self.draft.scopes)
        parent = self.open[-1] if self.open else None
        self.draft.scopes.append(
            DraftScope(
                number,
                -1 if parent is None else parent.number,
                "" if parent is None else parent.part,
                name,
                note.place,
            )
        )
        self.open.append(_Open(name, number, note.place))
        return self.open[-1]

    def end(self, pair: _Open | None, first: int) -> list[Fault]:
        """Give new steps, from `first` on, their scope; close what is complete."""
        steps = self.draft.steps
        faults = self._read_after_cleanup(steps[first:])
        inner = self.open[-1] if self.open else None
        if inner is None:
            return faults
        for place in range(first, len(steps)):
            if steps[place].scope < 0:
                steps[place] = steps[place]._replace(
                    scope=inner.number, part=inner.part
                )
        if pair is None:
            return faults
        if pair.part == "compute":
            pair.part = "body"
            return faults
        self.open.pop()
        self._note_cleaned(steps[first:])
        return faults + self._faults(pair, steps[first:])

    def _note_cleaned(self, undoing: Sequence[Step]) -> None:
        scratch = {
            wire
            for register in self.draft.registers
            if register.is_workspace
            for wire in range(register.first, register.first + register.width)
        }
        for step in undoing:
            for wire in scratch.intersection(written(step)):
                self.cleaned[wire] = step.place

    def _read_after_cleanup(self, steps: Sequence[Step]) -> list[Fault]:
        """Find steps that read scratch which a pair has cleaned up before."""
        faults = []
        for step in steps:
            if step.kind == "barrier":
                continue
            new = written(step)
            for wire in step.wires:
                if wire in new:
                    self.cleaned.pop(wire, None)
                elif wire in self.cleaned:
                    faults.append(
                        Fault(
                            step.place,
                            "read-after-cleanup",
                            f"'{step.name}' reads {self._names()[wire]}, which line "
                            f"{self.cleaned.pop(wire).line} has cleaned up",
                            "read it between the two halves of its pair",
                        )
                    )
        return faults

    def _faults(self, pair: _Open, undoing: Sequence[Step]) -> list[Fault]:
        inside = [s for s in self.draft.steps if self._is_inside(s, pair.number)]
        compute = [s for s in inside if self._part_in(s, pair.number) == "compute"]
        body = [s for s in inside if self._part_in(s, pair.number) == "body"]
        wanted = [inverse_step(step) for step in reversed(compute)]
        agree = len(wanted) == len(undoing) and all(
            _same(one, two) for one, two in zip(wanted, undoing, strict=True)
        )
        faults = body_faults(compute, body, self._names)
        if not agree:
            place = undoing[0].place if undoing else pair.place
            faults.append(
                Fault(
                    place,
                    "not-inverse",
                    f"this does not undo the compute part '{pair.name}' of line "
                    f"{pair.place.line} step by step",
                    "write 'inv @' of the same gate on the same qubits, or the same "
                    "steps backwards",
                )
            )
        return faults

    def _is_inside(self, step: Step, number: int) -> bool:
        return self._part_in(step, number) is not None

    def _part_in(self, step: Step, number: int) -> Part | None:
        scope, part = step.scope, step.part
        while scope >= 0:
            if scope == number:
                return part
            part, scope = self.draft.scopes[scope].part, self.draft.scopes[scope].parent
        return None

    def _names(self) -> list[str]:
        return [
            register.name if register.is_single else f"{register.name}[{i}]"
            for register in self.draft.registers
            for i in range(register.width)
        ]

    def left(self) -> list[Fault]:
        """Return a fault for every pair without its second statement."""
        return [
            Fault(
                pair.place,
                "pair-open",
                f"the pair '{pair.name}' is never ended",
                f"write '@placer.uncompute id={pair.name}' before what undoes it",
            )
            for pair in self.open
        ]


def _same(one: Step, two: Step) -> bool:
    return (
        (one.kind, one.name, one.wires, one.inverse, one.signature)
        == (two.kind, two.name, two.wires, two.inverse, two.signature)
        and len(one.params) == len(two.params)
        and all(
            math.isclose(a, b, rel_tol=0, abs_tol=_CLOSE)
            for a, b in zip(one.params, two.params, strict=True)
        )
    )
