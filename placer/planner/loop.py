"""The engine: policies, staged search, joint model, flips, and the choice at the end.

In: a problem, an effort, a seed.  Out: the best placement found, judged on a real
route, with the bound and what every fixed policy would have given.  Work is counted,
not timed, so that the same question gets the same answer.
"""

from __future__ import annotations

from dataclasses import dataclass
from importlib.metadata import version
from typing import TYPE_CHECKING

from placer.errors import InternalError, NoPlan, OutOfTime, PlacerError
from placer.halt import Halt, Interrupted
from placer.plan import POLICIES
from placer.planner import bounds, stages
from placer.planner.placement import Instance, keeps_limits, make_instance
from placer.planner.policies import everything_allowed
from placer.planner.pool import Pool
from placer.planner.stages import PolicyOutcome
from placer.planner.warm import note_of, settle_moves, take_over, worth_moving
from placer.planner.work import WORK, Effort, warmed
from placer.tables import device_tables

if TYPE_CHECKING:
    from collections.abc import Callable

    from placer.plan import Figures
    from placer.planner.judge import Judged
    from placer.planner.warm import Earlier
    from placer.problem import Problem

__all__ = ["WORK", "Effort", "Outcome", "PolicyOutcome", "run"]

JOINT_RULE = f"joint model (walk over all sites, CP-SAT {version('ortools')})"


@dataclass(frozen=True, slots=True)
class Outcome:
    """What the engine found; `least` is a proven bound of the placement cost.

    `notes` say what a reader must know of how it was found: an early end, an earlier
    plan.
    """

    instance: Instance
    judged: Judged
    least: int
    least_by: str
    is_proven: bool
    floor: int
    policies: tuple[PolicyOutcome, ...]
    seen: tuple[Figures, ...]
    notes: tuple[str, ...] = ()


def run(
    problem: Problem,
    *,
    effort: Effort,
    seed: int,
    progress: Callable[[str], None] = lambda _: None,
    halt: Halt | None = None,
    earlier: Earlier | None = None,
) -> Outcome:
    """Find the best plan that the effort allows.

    With an earlier plan to start from, only a part of the effort's work is done, and
    a wire moves only where that pays.

    Raises
    ------
    NoPlan
        If no placement exists (proved by the joint model).
    OutOfTime
        If none was found within the work or the time allowed.
    Interrupted
        If the user ended it before there was any plan.
    """
    halt = halt or Halt()
    work = WORK[effort] if earlier is None else warmed(WORK[effort])
    instance = make_instance(problem, device_tables(problem.device))
    pool = Pool(instance, work, seed, halt, progress)
    start = None
    if earlier is not None:
        pool.say("the earlier plan")
        start = take_over(pool, earlier)
    policies = tuple(stages.policy_outcome(pool, name) for name in POLICIES)
    starts = [p.judged.placement for p in policies if p.judged is not None]
    if start is not None:
        pool.estimates.append(start.placement)
        starts = [start.placement]
    stages.search_all(pool, starts, is_fresh=start is None)
    stages.fewer_sites(pool)
    stages.solve_joint(pool)
    stages.improve_windows(pool)
    stages.flip(pool)
    stages.repair(pool)
    policies = stages.polish(pool, policies)
    if start is not None:
        settle_moves(pool, start)
    best = worth_moving(pool, start)
    if best is None:
        raise _nothing(pool)
    notes = []
    if earlier is not None:
        notes.append(note_of(pool, start, best))
    best = pool.judge.with_expected_swaps(best, halt)
    if halt.note:
        notes.append(halt.note)
    return outcome(pool, best, policies, tuple(notes))


def _nothing(pool: Pool) -> PlacerError:
    if pool.is_impossible:
        return NoPlan("no placement keeps the limits on this device")
    if pool.halt.why == "interrupted":
        return Interrupted("interrupted before any plan was found")
    if pool.halt.why:
        return OutOfTime(f"{pool.halt.why} before any plan was found")
    return OutOfTime("no placement was found in the work allowed")


def outcome(
    pool: Pool,
    best: Judged,
    policies: tuple[PolicyOutcome, ...],
    notes: tuple[str, ...] = (),
) -> Outcome:
    """Put the result together with its bounds."""
    instance = pool.instance
    recipes = everything_allowed(instance)
    least = bounds.least_estimate(instance, recipes)
    by = bounds.ESTIMATE_RULE
    # The joint model bounds what keeps the limits; a plan that does not keep them may
    # cost less.
    is_bounded = keeps_limits(instance, best.placement)
    if pool.joint_bound is not None and is_bounded and pool.joint_bound >= least:
        least, by = pool.joint_bound, JOINT_RULE
    if least > best.estimate:
        raise InternalError(
            f"the bound {least} ({by}) passes the plan's cost {best.estimate}"
        )
    return Outcome(
        instance,
        best,
        least,
        by,
        least == best.estimate,
        bounds.floor_of_error(instance, recipes),
        policies,
        tuple(j.figures for j in pool.judged),
        notes,
    )
