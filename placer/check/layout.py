"""The placed circuit as the check lays it out: operations on tokens, and holders.

In: a case.  Out: all fine operations in placed order; a token bears the number of the
site that it started on.  Nothing moves here and nothing is timed.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from placer.check.base import TWO_BODY

if TYPE_CHECKING:
    from placer.check.case import Case, Planned
    from placer.recipes.circuit import Op


@dataclass(slots=True)
class Act:
    """One fine operation on tokens, and whom it acts for on each of them.

    `needs` says on which tokens a level-2 gate needs level 2 under it, `cause` which
    act writes its condition.
    """

    name: str
    tokens: tuple[int, ...]
    holders: tuple[int, ...]
    needs: tuple[bool, ...]
    enters: tuple[int, ...]
    leaves: tuple[int, ...]
    cause: int | None
    step: Planned
    end: int = -1

    @property
    def is_two_body(self) -> bool:
        """Whether it needs a link."""
        return self.name in TWO_BODY


@dataclass(slots=True)
class Layout:
    """All acts, in placed order.

    `queues[t]` are the acts on token t, `gates[g]` is the act of two-body gate g,
    `heard` lists the acts that wait for a measurement.  Holders are the wires, then
    the leases without a lender in placed order; `values` are those whose life is
    measured.  `lives[act, token]` says whether the holder is charged after it, and
    whether its value lives on.
    """

    acts: list[Act] = field(default_factory=list)
    queues: dict[int, list[int]] = field(default_factory=dict)
    gates: list[int] = field(default_factory=list)
    heard: dict[int, list[int]] = field(default_factory=dict)
    names: list[str] = field(default_factory=list)
    values: set[int] = field(default_factory=set)
    lives: dict[tuple[int, int], tuple[bool, int | None]] = field(default_factory=dict)


def lay_out(case: Case) -> Layout:
    """Return the placed circuit of a case."""
    program = case.program
    layout = Layout(names=list(program.wire_names))
    number_of = {name: w for w, name in enumerate(program.wire_names)}
    for wire in range(len(program.wire_names)):
        if program.register_at(wire).workspace:
            layout.values.add(wire)
    answers: dict[str, int] = {}
    for step in case.order():
        holders: list[int] = list(step.op.wires)
        for lease in step.leases:
            lender = None if lease.lender is None else number_of.get(lease.lender)
            if lender is None:
                lender = len(layout.names)
                layout.values.add(lender)
                layout.names.append(slot_name(step, lease.slot))
            holders.append(lender)
        _add_acts(layout, step, holders, answers)
    for token in sorted(layout.queues):
        _mark_lives(layout, token, len(program.wire_names))
    return layout


def slot_name(step: Planned, slot: int) -> str:
    """Name a slot as figures do."""
    line = step.op.place.line
    at = f" at line {line}" if line else f" in step {step.op.index}"
    return f"slot {slot} of '{step.op.name}'{at}"


def _add_acts(
    layout: Layout, step: Planned, holders: list[int], answers: dict[str, int]
) -> None:
    """Add the acts of a step; `answers` knows the measurement behind each bit."""
    measured: dict[int, int] = {}
    for op in step.built.fine.ops:
        number = len(layout.acts)
        act = _act(step, op, holders, measured, answers)
        layout.acts.append(act)
        if op.bit is not None:
            measured[op.bit] = number
        if op.name == "measure" and step.op.bit is not None:
            answers[step.op.bit] = number
        if act.cause is not None:
            layout.heard.setdefault(act.cause, []).append(number)
        for token in dict.fromkeys(act.tokens):
            layout.queues.setdefault(token, []).append(number)
        if act.is_two_body:
            layout.gates.append(number)


def _act(
    step: Planned,
    op: Op,
    holders: list[int],
    measured: dict[int, int],
    answers: dict[str, int],
) -> Act:
    high = op.name == "level2"
    where = step.where
    cause = None if op.condition is None else measured.get(op.condition)
    if op.listens is not None:
        cause = answers.get(op.listens)
    return Act(
        name=op.name,
        tokens=tuple(where[w] for w in op.wires),
        holders=tuple(holders[w] for w in op.wires),
        needs=tuple(high and w in step.built.level2_wires for w in op.wires),
        enters=tuple(where[w] for w in op.enters),
        leaves=tuple(where[w] for w in op.leaves),
        cause=cause,
        step=step,
    )


def _mark_lives(layout: Layout, token: int, wires: int) -> None:
    """Note for each act on a token what lives on after it.

    A holder has all its acts on one token, in a row.  The last act of a wire that is
    no workspace leaves it alive, unless it is a measurement or a reset; a reset ends
    the life of a wire until its next act, slots are charged through.
    """
    queue = layout.queues[token]
    for number, following in zip(queue, [*queue[1:], None], strict=True):
        act = layout.acts[number]
        holder = _holder(act, token)
        goes_on = (
            following is not None and _holder(layout.acts[following], token) == holder
        )
        if goes_on:
            is_charged = act.name != "reset" or holder >= wires
        else:
            gone = act.name in ("reset", "measure")
            is_charged = holder not in layout.values and not gone
        is_alive = goes_on and act.name != "reset" and holder in layout.values
        layout.lives[number, token] = (is_charged, holder if is_alive else None)


def _holder(act: Act, token: int) -> int:
    return act.holders[act.tokens.index(token)]
