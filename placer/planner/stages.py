"""The stages of the engine, each one function of the pool of candidates.

In: the pool.  Out: more candidates in it.  Their order is decided in `loop`.
"""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from placer.errors import InternalError
from placer.planner import bounds
from placer.planner.anneal import move
from placer.planner.joint import Open, everything, solve, tighten
from placer.planner.judge import Judge
from placer.planner.placement import Instance, Misfit, make_instance
from placer.planner.policies import allowed
from placer.planner.proof import can_prove
from placer.planner.rank import in_the_spirit
from placer.planner.region import narrowed
from placer.planner.search import Amount, search
from placer.planner.windows import improve

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.planner.judge import Judged
    from placer.planner.placement import Placement
    from placer.planner.pool import Pool


@dataclass(frozen=True, slots=True)
class PolicyOutcome:
    """The best plan of one fixed policy, or why there is none."""

    policy: str
    reason: str
    judged: Judged | None


def policy_outcome(pool: Pool, name: str) -> PolicyOutcome:
    """Plan with one fixed workspace policy."""
    pool.say(f"policy: {name} only")
    only = pool.instance.problem.only
    if only and name not in only:
        return PolicyOutcome(name, "left out by --only", None)
    choice, reason = allowed(pool.instance, name)
    if reason:
        return PolicyOutcome(name, reason, None)
    choice = in_the_spirit(pool.instance, choice)
    amount = pool.fit(pool.work.policy)
    found = pool.search(choice, amount=amount, seed=pool.seed)
    if not found and pool.is_over():
        return PolicyOutcome(name, "not planned in the time allowed", None)
    if not found:
        return PolicyOutcome(name, "not enough free sites at some call", None)
    pool.estimates += [c.placement for c in found[:1]]
    judged = pool.take([c.placement for c in found], 4)
    if not judged:
        return PolicyOutcome(name, "no route exists", None)
    return PolicyOutcome(name, "", min(judged, key=pool.key))


def search_all(
    pool: Pool, starts: Sequence[Placement], *, is_fresh: bool = True
) -> None:
    """Search with every recipe, from scratch (if fresh) and from given placements."""
    pool.say("search: all recipes")
    amount = dataclasses.replace(pool.fit(pool.work.search), embeds=pool.work.embeds)
    found = pool.search(pool.recipes, amount=amount, seed=pool.seed) if is_fresh else []
    every = (1.0,) * max(1, len(starts))
    short = pool.fit(Amount(2, pool.work.search.moves // 2, every))
    if starts:
        found += pool.search(
            pool.recipes, amount=short, seed=pool.seed + 1, starts=starts
        )
    found.sort(key=lambda c: c.estimate)
    pool.estimates += [c.placement for c in found[:1]]
    pool.take([c.placement for c in found], pool.work.routed)


def fewer_sites(pool: Pool) -> None:
    """Search within ever smaller regions, for the goal of the fewest sites."""
    if pool.instance.problem.goal != "sites":
        return
    best = pool.best()
    while best is not None and not pool.is_over():
        most = best.figures.sites - 1
        pool.say(f"fewer sites: {most}")
        found = _within(pool, most)
        if found is None or found.figures.sites > most:
            return
        pool.judged.append(found)
        best = pool.best()


def _within(pool: Pool, most: int) -> Judged | None:
    """Return the best plan within a compact region of so many sites."""
    problem = pool.instance.problem
    budget = dataclasses.replace(problem.budget, most_sites=most)
    limited = dataclasses.replace(problem, budget=budget)
    region = narrowed(make_instance(limited, pool.instance.tables))
    if len(region.usable) != most:
        return None
    found = search(
        region, pool.recipes, amount=pool.fit(pool.work.search), seed=pool.seed
    )
    judge = Judge(pool.instance, seed=pool.seed, route_tables=region.tables)
    wide = [tighten(pool.instance, c.placement) for c in found[: pool.work.routed]]
    judged = [j for p in wide if (j := judge.route(p)) is not None]
    return min(judged, key=pool.key, default=None)


def solve_joint(pool: Pool) -> None:
    """Prove the least placement cost where the problem is small enough."""
    is_large = _joint_size(pool.instance) > pool.work.joint_size
    if pool.is_over() or (is_large and not can_prove(pool.instance)):
        return
    pool.say("joint model: prove")
    choice: Open = everything(pool.instance)
    hint = pool.cheapest()
    answer = solve(
        pool.instance,
        choice,
        work=pool.work.joint,
        seed=pool.seed,
        hint=hint,
        halt=pool.halt,
        # Without any placement, a proof that there is none is worth a large model.
        largest=None if hint is None else pool.work.joint_size,
    )
    if answer.status == "none":
        if hint is not None and not _has_hard_limits(pool.instance):
            raise InternalError("the joint model denies a placement that exists")
        pool.is_impossible = hint is None
        return
    pool.joint_bound = answer.bound
    if answer.placement is not None:
        pool.estimates.append(answer.placement)
        pool.take([answer.placement], 1)


def improve_windows(pool: Pool) -> None:
    """Improve the cheapest placement window by window."""
    start = pool.cheapest()
    if start is None or pool.work.windows == 0 or pool.is_over():
        return
    if pool.narrow is not pool.instance:
        # Windows would reach for sites outside the region.
        return
    if pool.judge.estimate(start) == pool.joint_bound:
        return
    pool.say("windows: recipes, slots and order again")
    better = improve(
        pool.instance,
        start,
        pool.recipes,
        windows=pool.work.windows,
        seed=pool.seed,
        halt=pool.halt,
    )
    if better != start:
        pool.estimates.append(better)
        pool.take([better], 1)


def flip(pool: Pool) -> None:
    """Try other recipes for all calls of one size at once, judged by route."""
    if pool.instance.problem.goal == "estimate":
        return
    best = pool.best()
    tried = 0
    most = pool.work.flips
    amount = Amount(1, pool.work.search.moves // 4, (1.0,))
    for steps, recipe in _classes(pool):
        if best is None or tried >= most or pool.is_spent(best) or pool.is_over():
            return
        if all(best.placement.recipes[i] == recipe for i in steps):
            continue
        tried += 1
        pool.say(f"flips: {tried} of {most}")
        wanted = set(steps)
        choice = tuple(
            (recipe,) if i in wanted else (best.placement.recipes[i],)
            for i in range(pool.instance.steps)
        )
        found = pool.search(
            choice, amount=amount, seed=pool.seed + tried, starts=[best.placement]
        )
        pool.take([c.placement for c in found], 1)
        best = pool.best()


def repair(pool: Pool) -> None:
    """Take workspace that is no value for calls whose slots outlive the budget.

    Starts from the plan of least expected error, whether it fits or not; a call that
    was late once never again gets workspace but what a wire lends.
    """
    current = min(pool.judged, key=lambda j: j.figures.costs.total, default=None)
    left = pool.work.repair_gates
    late: set[int] = set()
    for number in range(pool.work.repairs):
        if current is None or set(current.late) <= late or left < 0 or pool.is_over():
            return
        late |= set(current.late)
        pool.say(f"repair: {len(late)} calls hold values too long")
        kept = tuple(
            pool.recipes[i] if i in late else (c,)
            for i, c in enumerate(current.placement.recipes)
        )
        found = pool.search(
            kept,
            amount=Amount(1, pool.work.search.moves // 8, (1.0,)),
            seed=pool.seed + 77 + number,
            starts=[current.placement],
            lent_only=frozenset(late),
        )
        if not found:
            return
        left -= pool.judge.gates(found[0].placement)
        current = pool.route(found[0].placement, is_needed=True)


def polish(
    pool: Pool, policies: tuple[PolicyOutcome, ...]
) -> tuple[PolicyOutcome, ...]:
    """Route the best few again with other seeds and starts, policies too, fairly."""
    pool.say("routes: the best candidates again")
    firsts = sorted(pool.judged, key=pool.key)[:3]
    for judged in firsts:
        route_again(pool, judged)
    for number, judged in enumerate(firsts):
        turn(pool, judged, f"there and back: {number + 1} of {len(firsts)}")
    return tuple(
        PolicyOutcome(
            p.policy,
            p.reason,
            None if p.judged is None else _polished(pool, p.policy, p.judged),
        )
        for p in policies
    )


def _polished(pool: Pool, policy: str, judged: Judged) -> Judged:
    best = route_again(pool, judged)
    return turn(pool, best, f"there and back: {policy} only")


def turn(pool: Pool, judged: Judged, stage: str) -> Judged:
    """Start where a way back from the end of the route leads to, again and again.

    The way back looks at the first gates last, so it gathers what they need.  Returns
    the best that was met.
    """
    best = current = judged
    if pool.instance.problem.goal == "estimate":
        return best
    for number in range(pool.work.turns):
        if pool.is_spent(current) or pool.is_over():
            return best
        pool.say(stage)
        pool.gates_left -= pool.judge.gates(current.placement)
        to = pool.judge.turned(current, number)
        if to is None:
            return best
        try:
            moved = move(pool.instance, current.placement, to)
        except Misfit:
            return best
        found = pool.route(moved, number % max(1, pool.work.routes))
        if found is None:
            return best
        current = found
        best = min(best, found, key=pool.key)
    return best


def route_again(pool: Pool, judged: Judged) -> Judged:
    """Return the best of a placement's routes with the other settings and seeds."""
    best = judged
    for number in range(1, pool.work.routes):
        again = pool.route(judged.placement, number)
        if again is not None:
            best = min(best, again, key=pool.key)
    return best


def _classes(pool: Pool) -> list[tuple[list[int], int]]:
    """Return (steps of one size, recipe) to try, the largest classes first."""
    instance = pool.instance
    classes: dict[tuple[str, ...], list[int]] = {}
    for i, row in enumerate(instance.profiles):
        if len(row) > 1:
            key = (str(row[0].built.controls), *(p.built.recipe for p in row))
            classes.setdefault(key, []).append(i)
    ranked = sorted(classes.values(), key=lambda steps: (-len(steps), steps))
    result: list[tuple[list[int], int]] = []
    depth = 0
    while True:
        layer = []
        for steps in ranked:
            order = bounds.cheapest_first(instance, steps[0])
            order = [c for c in order if c in pool.recipes[steps[0]]]
            if depth < min(len(order), 4):
                layer.append((steps, order[depth]))
        if not layer:
            return result
        result += layer
        depth += 1


def _joint_size(instance: Instance) -> int:
    """Return about how many clauses the joint model has."""
    sites = len(instance.usable)
    usable = list(instance.usable)
    prices = instance.tables.pair_cost((False, False, False))[usable][:, usable]
    levels = len(np.unique(prices))
    meetings = sum(len(profile.pairs) for row in instance.profiles for profile in row)
    return meetings * sites * levels


def _has_hard_limits(instance: Instance) -> bool:
    budget = instance.problem.budget
    return budget.most_sites is not None or budget.longest_ns is not None
