"""The planned schedule: what may be used at all, order and length of steps."""

from __future__ import annotations

import itertools
from typing import TYPE_CHECKING

from placer.check.base import base_of

if TYPE_CHECKING:
    from collections.abc import Iterator

    from placer.check.case import Case, Planned


def check_schedule(case: Case) -> None:
    """Apply every rule of the planned schedule that asks nothing of other steps' sites.

    Which thing holds which site is asked in `places`, what it costs in `estimate`.
    """
    _check_excluded(case)
    _check_capabilities(case)
    _check_level2(case)
    _check_order(case)
    for step in case.steps:
        duration = _duration(case, step)
        if duration is not None and step.end - step.start != duration:
            text = f"[{step.start}, {step.end}) is stated, it takes {duration} ns"
            case.find("duration-misstated", step.label, text)


def _check_excluded(case: Case) -> None:
    """Only workspace asked for; two controls without a slot leave nothing to choose."""
    only = case.data["only"]
    for step in case.steps:
        built = step.built
        if not only or not step.op.is_call or built.workspace in only:
            continue
        is_small = step.op.signature is None and step.op.controls == 2
        if built.workspace == "none" and is_small:
            continue
        text = f"'{built.recipe}' uses {built.workspace}, allowed: {', '.join(only)}"
        case.find("recipe-excluded", step.label, text)


def _check_capabilities(case: Case) -> None:
    """Measure in mid-circuit, react to it, and reset: only where the device can.

    A measurement is in mid-circuit if its wire is used again, by more than a barrier.
    """
    able = case.device.capabilities
    last = {
        wire: max((s.op.index for s in steps if s.op.kind != "barrier"), default=-1)
        for wire, steps in case.uses.items()
    }
    for step in case.steps:
        kind = step.op.kind
        missing = ""
        listens = step.built.needs_measurement or step.op.condition is not None
        if step.built.needs_measurement and not able.mid_circuit_measurement:
            missing = "measurement in mid-circuit"
        elif listens and able.conditional_ns is None:
            missing = "conditional gates"
        elif kind == "reset" and not able.reset:
            missing = "reset"
        elif kind == "measure" and not able.mid_circuit_measurement:
            used_again = any(last[wire] != step.op.index for wire in step.op.wires)
            missing = "measurement in mid-circuit" if used_again else ""
        if missing:
            text = f"'{step.built.recipe}' needs {missing}, {case.device.name} has none"
            case.find("capability-missing", step.label, text)


def _check_level2(case: Case) -> None:
    for step in case.steps:
        for wire in step.built.level2_wires:
            site = step.where[wire]
            if case.device.sites[site].level2 is None:
                text = f"'{step.built.recipe}' needs level 2 on site {site}"
                case.find("level2-missing", step.label, text)


def _check_order(case: Case) -> None:
    for one, two, shared in _ordered(case):
        if two.start < one.end:
            text = f"starts at {two.start}, {one.label} on {shared} ends at {one.end}"
            case.find("order-broken", two.label, text)


def _ordered(case: Case) -> Iterator[tuple[Planned, Planned, str]]:
    """Return steps that must not overlap: earlier, later, and what they share.

    A gate comes between the measurement it waits for and the next into that bit.
    """
    for wire in sorted(case.uses):
        for one, two in itertools.pairwise(case.uses[wire]):
            yield one, two, case.program.wire_names[wire]
    written: dict[str, Planned] = {}
    heard: dict[str, list[Planned]] = {}
    for step in case.steps:
        bit = step.op.condition
        if bit is not None and bit in written:
            yield written[bit], step, f"bit {bit}"
            heard.setdefault(bit, []).append(step)
        bit = step.op.bit
        if bit is not None:
            for one in heard.pop(bit, ()):
                yield one, step, f"bit {bit}"
            if bit in written:
                yield written[bit], step, f"bit {bit}"
            written[bit] = step


def _duration(case: Case, step: Planned) -> int | None:
    """Base duration + gates * distance * what a step of a move takes."""
    base = base_of(step.built, case.numbers)
    duration = base.length
    for (a, b, kind), count in base.pairs.items():
        met = case.numbers.meeting(step.where[a], step.where[b], kind)
        if met is None:
            text = f"sites {step.where[a]} and {step.where[b]} reach no fitting link"
            case.find("link-out-of-reach", step.label, text)
            return None
        duration += count * met[1] * case.numbers.move_ns
    return duration
