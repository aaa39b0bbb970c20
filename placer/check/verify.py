"""Verify a plan from its JSON text alone.

In: the text.  Out: every broken rule.  Shares no arithmetic with the planner: program
and device are read again, the placed circuit is replayed, times, costs, leases,
figures, limits and verdict are made anew.  Not verified: the rows of other policies,
the reasons given for lost recipes, the held-out number of swaps, and the value of
`bound.least` beyond its not passing the plan's own cost.
"""

from __future__ import annotations

from dataclasses import dataclass

from placer.check.case import Case, Finding, open_case
from placer.check.figures import check_figures
from placer.check.follow import Follower
from placer.check.replay import Replay, check_recipes
from placer.check.rules import RULES
from placer.check.schedule import Schedule
from placer.plan import from_json

SEED = 20_260_301


@dataclass(frozen=True, slots=True)
class CheckResult:
    """What the check found; `ok` is true when no rule is broken."""

    ok: bool
    findings: tuple[Finding, ...]
    rules: tuple[str, ...]
    notes: tuple[str, ...]


def check_plan(text: str, path: str = "plan") -> CheckResult:
    """Return every rule that a plan breaks.

    Raises
    ------
    InputError
        If the text is not a plan file at all.
    """
    case = open_case(from_json(text, path))
    if not isinstance(case, Case):
        return _result(case, [])
    Schedule(case).check()
    notes = check_recipes(case, SEED)
    Replay(case, SEED).check()
    walk = Follower(case)
    walk.walk()
    if not walk.is_broken:
        check_figures(case, walk)
    return _result(case.findings, notes)


def _result(findings: list[Finding], notes: list[str]) -> CheckResult:
    return CheckResult(not findings, tuple(findings), tuple(RULES), tuple(notes))
