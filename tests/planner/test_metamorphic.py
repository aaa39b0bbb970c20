"""What must not change the least cost, and what can only lower it.

Nothing is known of the least cost itself here: two proven optima are compared.
"""

from __future__ import annotations

import dataclasses
import random

import pytest

from placer.device.model import Budget, Device, Link, SiteId
from placer.planner.joint import everything, solve
from placer.planner.placement import make_instance
from placer.problem import Problem
from placer.program.model import WireId
from placer.tables import device_tables
from tests.planner.generate import tiny_problem

SEEDS = [*range(400, 406)]
MORE = [pytest.param(s, marks=pytest.mark.slow) for s in range(410, 440)]


def least(problem: Problem) -> int | None:
    """Return the proven least cost, `None` if nothing is possible."""
    instance = make_instance(problem, device_tables(problem.device))
    answer = solve(instance, everything(instance), work=30.0, seed=0)
    assert answer.status in ("best", "none"), answer.status
    return answer.cost


def is_no_dearer(new: int | None, old: int | None) -> bool:
    return old is None or (new is not None and new <= old)


def drawn(seed: int) -> Problem:
    problem = tiny_problem(seed)
    if problem is None:
        pytest.skip("a call of this seed has no recipe")
    return problem


def with_links(device: Device, sites: tuple, links: list[Link]) -> Device:  # type: ignore[type-arg]
    ranked = tuple(sorted(links, key=lambda k: (k.a, k.b)))
    return dataclasses.replace(
        device,
        sites=sites,
        links=ranked,
        hash=repr((sites, ranked)),
        link_at={(k.a, k.b): k for k in ranked},
    )


def renumbered(problem: Problem, draw: random.Random) -> Problem:
    """Return the problem with other numbers for the same sites."""
    device = problem.device
    count = len(device.sites)
    to = draw.sample(range(count), count)
    sites = [device.sites[0]] * count
    for site in device.sites:
        sites[to[site.id]] = dataclasses.replace(site, id=SiteId(to[site.id]))
    links = [
        dataclasses.replace(
            k,
            a=SiteId(min(to[k.a], to[k.b])),
            b=SiteId(max(to[k.a], to[k.b])),
        )
        for k in device.links
    ]
    return dataclasses.replace(problem, device=with_links(device, tuple(sites), links))


def renamed(problem: Problem, draw: random.Random) -> Problem:
    """Return the problem with its wires declared in another order."""
    program = problem.program
    count = len(program.wire_names)
    order = draw.sample(range(count), count)
    to = {old: new for new, old in enumerate(order)}
    registers = tuple(
        dataclasses.replace(program.registers[old], first=WireId(new))
        for new, old in enumerate(order)
    )
    operations = tuple(
        dataclasses.replace(op, wires=tuple(WireId(to[w]) for w in op.wires))
        for op in program.operations
    )
    again = dataclasses.replace(
        program,
        registers=registers,
        wire_names=tuple(program.wire_names[old] for old in order),
        operations=operations,
    )
    return dataclasses.replace(problem, program=again)


def typical(device: Device) -> Link:
    """Return a link whose times are the nominal ones, which it leaves as they are."""
    usable = [k for k in device.links if device.is_usable(k)]
    by_time = sorted(usable, key=lambda k: k.time_ns)
    middle = by_time[(len(by_time) - 1) // 2]
    return dataclasses.replace(middle, error=max(k.error for k in usable))


def with_another_site(problem: Problem) -> Problem:
    """Return the problem with one more site at the end of one more link."""
    device = problem.device
    alive = [s for s in device.sites if s.in_service]
    middle = (len(alive) - 1) // 2
    new = dataclasses.replace(
        alive[0],
        id=SiteId(len(device.sites)),
        gate_ns=sorted(s.gate_ns for s in alive)[middle],
        readout_ns=sorted(s.readout_ns for s in alive)[middle],
        reset_ns=sorted(s.reset_ns for s in alive)[middle],
    )
    link = dataclasses.replace(typical(device), a=alive[-1].id, b=new.id)
    return dataclasses.replace(
        problem,
        device=with_links(device, (*device.sites, new), [*device.links, link]),
    )


def with_another_link(problem: Problem, draw: random.Random) -> Problem | None:
    """Return the problem with two more sites linked, `None` if all are."""
    device = problem.device
    alive = [s.id for s in device.sites if s.in_service]
    missing = [
        (a, b) for a in alive for b in alive if a < b and device.link(a, b) is None
    ]
    if not missing:
        return None
    a, b = draw.choice(missing)
    link = dataclasses.replace(typical(device), a=a, b=b)
    return dataclasses.replace(
        problem, device=with_links(device, device.sites, [*device.links, link])
    )


def with_a_better_link(problem: Problem, draw: random.Random) -> Problem:
    """Return the problem with a link that errs half as often."""
    device = problem.device
    better = draw.randrange(len(device.links))
    links = [
        dataclasses.replace(k, error=k.error / 2) if n == better else k
        for n, k in enumerate(device.links)
    ]
    return dataclasses.replace(problem, device=with_links(device, device.sites, links))


@pytest.mark.parametrize("seed", [*SEEDS, *MORE])
def test_other_names_change_nothing(seed: int) -> None:
    problem = drawn(seed)
    cost = least(problem)
    assert least(renumbered(problem, random.Random(seed))) == cost
    assert least(renamed(problem, random.Random(seed))) == cost


@pytest.mark.parametrize("seed", [*SEEDS, *MORE])
def test_more_room_never_costs_more(seed: int) -> None:
    problem = drawn(seed)
    cost = least(problem)
    assert is_no_dearer(least(with_another_site(problem)), cost)
    linked = with_another_link(problem, random.Random(seed))
    if linked is not None:
        assert is_no_dearer(least(linked), cost)
    assert is_no_dearer(least(with_a_better_link(problem, random.Random(seed))), cost)


@pytest.mark.parametrize("seed", [*SEEDS, *MORE])
def test_a_looser_budget_never_costs_more(seed: int) -> None:
    problem = drawn(seed)
    working = sum(s.in_service for s in problem.device.sites)
    costs = []
    for most in (working - 1, working, None):
        budget = Budget(most_sites=most)
        costs.append(least(dataclasses.replace(problem, budget=budget)))
    for longest in (2_000, 6_000, None):
        budget = Budget(longest_ns=longest)
        costs.append(least(dataclasses.replace(problem, budget=budget)))
    for tight, loose in ((0, 1), (1, 2), (3, 4), (4, 5)):
        assert is_no_dearer(costs[loose], costs[tight])
    assert costs[2] == costs[5]
