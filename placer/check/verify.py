"""Verify a plan from its JSON text alone.

In: the text.  Out: every broken rule.  Program and device are read again from the
texts in the plan; circuits are simulated, the placed program is replayed, times, costs,
leases and figures are made anew from their definitions.  Not verified: that the bounds
hold, figures of other policies, the reasons why recipes lost, and held-out routes.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from placer.check.case import Case, Finding, open_case
from placer.check.circuits import SEED, check_circuits
from placer.check.conclusions import check_conclusions
from placer.check.estimate import check_estimate
from placer.check.figures import check_figures
from placer.check.follow import Follower
from placer.check.orders import check_orders
from placer.check.places import check_places
from placer.check.replay import check_replay
from placer.check.rules import NAMES
from placer.check.schedule import check_schedule
from placer.plan import from_json
from placer.recipes import catalog

if TYPE_CHECKING:
    from placer.check.case import Build

__all__ = ["CheckResult", "Finding", "check_plan"]


@dataclass(frozen=True, slots=True)
class CheckResult:
    """What the check found; `ok` is true when no rule is broken."""

    ok: bool
    findings: tuple[Finding, ...]
    rules: tuple[str, ...]
    notes: tuple[str, ...]


def check_plan(
    text: str, path: str = "plan", *, build: Build = catalog.build
) -> CheckResult:
    """Return every rule that a plan breaks.

    Parameters
    ----------
    text, path
        The JSON text of a plan, and what it is called in messages.
    build
        Makes recipes concrete; tests hand in circuits that are wrong.

    Raises
    ------
    InputError
        If the text is not a plan file at all.
    """
    case = open_case(from_json(text, path), build)
    if not isinstance(case, Case):
        return _result(case, [])
    check_schedule(case)
    check_places(case)
    check_estimate(case)
    notes = check_circuits(case, build)
    check_replay(case, SEED)
    walk = Follower(case).follow()
    if not walk.is_broken:
        check_figures(case, walk)
    check_conclusions(case)
    check_orders(case)
    return _result(case.findings, notes)


def _result(findings: list[Finding], notes: list[str]) -> CheckResult:
    return CheckResult(not findings, tuple(findings), NAMES, tuple(notes))
