"""The walk over all sites: against the solver, under renumbering, and its parts."""

from __future__ import annotations

import dataclasses
import itertools
import random

import numpy as np
import pytest

from placer.device.lattices import grid, line, ring
from placer.device.model import Budget, Capabilities, Device, Link, Site, SiteId
from placer.errors import Place
from placer.planner import joint, proof
from placer.planner.joint import everything, solve
from placer.planner.model import Open
from placer.planner.placement import (
    Instance,
    Placement,
    evaluate,
    make_instance,
    step_cost,
)
from placer.planner.policies import everything_allowed
from placer.planner.proof import prove
from placer.planner.search import Amount, search
from placer.planner.steptables import NEVER, least_over_slots, reach_of
from placer.planner.symmetry import representatives, symmetries
from placer.problem import make_problem
from placer.program.model import Operation, Program, Register, WireId
from placer.tables import device_tables

SHAPES = {"line6": line(6), "ring6": ring(6), "grid6": grid(2, 3), "grid9": grid(3, 3)}


def device(name: str, draw: random.Random, *, is_uneven: bool) -> Device:
    lattice = SHAPES[name]

    def about(value: float) -> float:
        return value * (draw.uniform(0.5, 2.0) if is_uneven else 1.0)

    sites = []
    for number in range(lattice.count):
        t1 = about(90.0)
        sites.append(
            Site(
                id=SiteId(number),
                t1_us=t1,
                t2_us=min(about(70.0), 1.9 * t1),
                gate_error=about(4e-4),
                gate_ns=30,
                readout_error=about(9e-3),
                readout_ns=400,
                reset_error=5e-3,
                reset_ns=300,
                prep_error=about(4e-3),
                level2=None,
                in_service=True,
                xy=lattice.xy[number],
            )
        )
    links = [
        Link(SiteId(a), SiteId(b), about(6e-3), 60, None, None)
        for a, b in lattice.links
    ]
    return with_parts(sites, links)


def with_parts(sites: list[Site], links: list[Link]) -> Device:
    return Device(
        name="made",
        note="",
        calibrated="2026-01-01",
        lattice="listed",
        sites=tuple(sites),
        links=tuple(links),
        capabilities=Capabilities(False, None, True),
        t_gate=None,
        budget=Budget(),
        text="",
        path="made",
        hash=repr((sites, links)),
        link_at={(k.a, k.b): k for k in links},
    )


def program(wires: int, calls: int, draw: random.Random) -> Program:
    operations = tuple(
        Operation(
            number,
            draw.choice(("mcx", "mcz")),
            "call",
            tuple(WireId(w) for w in draw.sample(range(wires), draw.choice((3, 3, 4)))),
        )
        for number in range(calls)
    )
    registers = tuple(
        Register(
            f"q{w}",
            1,
            True,
            draw.choice(("unknown", "zero")),
            False,
            True,
            WireId(w),
            Place(""),
        )
        for w in range(wires)
    )
    return Program(
        name="made",
        syntax="openqasm3",
        registers=registers,
        wire_names=tuple(r.name for r in registers),
        operations=operations,
        scopes=(),
        bits=(),
        kept=(),
        assumed="",
        open_inputs=False,
        text="",
        path="made.qasm",
        hash=repr((registers, operations)),
        register_of=tuple(range(wires)),
    )


def instance_of(on: Device, asked: Program) -> Instance:
    return make_instance(make_problem(on, asked, goal="estimate"), device_tables(on))


def drawn(seed: int, name: str, *, is_uneven: bool) -> Instance:
    draw = random.Random(seed)
    on = device(name, draw, is_uneven=is_uneven)
    return instance_of(on, program(5, 4, draw))


def hint(instance: Instance) -> Placement:
    recipes = everything_allowed(instance)
    found = search(instance, recipes, amount=Amount(3, 20_000, (1.0,)), seed=0)
    return found[0].placement


def least(instance: Instance) -> int:
    found = solve(
        instance, everything(instance), work=30.0, seed=0, hint=hint(instance)
    )
    assert found.status == "best"
    assert found.cost is not None
    return found.cost


@pytest.mark.parametrize("name", ["line6", "ring6", "grid6"])
@pytest.mark.parametrize("seed", range(2))
def test_the_solver_alone_agrees(
    name: str, seed: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    instance = drawn(seed, name, is_uneven=False)
    walked = least(instance)
    monkeypatch.setattr(joint, "can_prove", lambda *_: False)
    alone = solve(
        instance, everything(instance), work=30.0, seed=0, hint=hint(instance)
    )
    assert alone.bound is not None
    assert alone.cost is not None
    assert alone.bound <= walked <= alone.cost
    if alone.status == "best":
        assert alone.cost == walked


@pytest.mark.parametrize("name", sorted(SHAPES))
def test_fewer_leaves_or_nodes_only_weaken_the_bound(
    name: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    instance = drawn(3, name, is_uneven=True)
    truth = least(instance)
    for leaves, nodes in ((3, 1_500_000), (30_000, 2_000), (2, 300), (1, 1)):
        monkeypatch.setattr(proof, "MOST_LEAVES", leaves)
        monkeypatch.setattr(proof, "NODES_PER_WORK", nodes)
        found = prove(instance, everything(instance), beat=2 * truth, work=20.0, seed=0)
        assert found.bound <= truth <= found.cost
        if found.bound == found.cost:
            assert found.cost == truth


def test_little_work_still_gives_a_valid_bound() -> None:
    instance = drawn(4, "grid9", is_uneven=True)
    truth = least(instance)
    start = hint(instance)
    for work in (0.001, 0.01, 0.1):
        found = solve(instance, everything(instance), work=work, seed=0, hint=start)
        assert found.bound is not None
        assert found.cost is not None
        assert found.bound <= truth <= found.cost <= evaluate(instance, start).cost


def test_the_same_answer_again() -> None:
    instance = drawn(5, "grid9", is_uneven=True)
    start = hint(instance)
    one, two = (
        solve(instance, everything(instance), work=5.0, seed=0, hint=start)
        for _ in range(2)
    )
    assert one == two


@pytest.mark.parametrize("name", sorted(SHAPES))
def test_renumbered_sites_and_wires_cost_the_same(name: str) -> None:
    draw = random.Random(name)
    on = device(name, draw, is_uneven=True)
    asked = program(5, 4, draw)
    to = list(range(len(on.sites)))
    draw.shuffle(to)
    sites = sorted(
        (dataclasses.replace(s, id=SiteId(to[s.id])) for s in on.sites),
        key=lambda s: s.id,
    )
    links = [
        dataclasses.replace(
            k, a=SiteId(min(to[k.a], to[k.b])), b=SiteId(max(to[k.a], to[k.b]))
        )
        for k in on.links
    ]
    wire_to = list(range(5))
    draw.shuffle(wire_to)
    registers = list(asked.registers)
    for w, register in enumerate(asked.registers):
        registers[wire_to[w]] = dataclasses.replace(
            register, first=WireId(wire_to[w]), name=f"q{wire_to[w]}"
        )
    renumbered = dataclasses.replace(
        asked,
        registers=tuple(registers),
        operations=tuple(
            dataclasses.replace(op, wires=tuple(WireId(wire_to[w]) for w in op.wires))
            for op in asked.operations
        ),
        hash="renumbered",
    )
    there = instance_of(with_parts(sites, links), renumbered)
    assert least(there) == least(instance_of(on, asked))


@pytest.mark.parametrize("name", ["line6", "grid6"])
def test_a_better_device_is_never_dearer(name: str) -> None:
    draw = random.Random(f"better {name}")
    on = device(name, draw, is_uneven=True)
    asked = program(5, 3, draw)
    before = least(instance_of(on, asked))
    sites, links = list(on.sites), list(on.links)
    # One more site, at the end of a link as good as another.
    last = SiteId(len(sites))
    more_sites = [*sites, dataclasses.replace(sites[0], id=last)]
    more_links = [*links, dataclasses.replace(links[0], a=SiteId(0), b=last)]
    assert least(instance_of(with_parts(more_sites, more_links), asked)) <= before
    # One more link.
    extra = dataclasses.replace(links[0], a=SiteId(0), b=SiteId(len(sites) - 1))
    with_link = sorted([*links, extra], key=lambda k: (k.a, k.b))
    assert least(instance_of(with_parts(sites, with_link), asked)) <= before
    # A dearer link, a site that decays faster.
    worse = list(links)
    worse[1] = dataclasses.replace(links[1], error=2 * links[1].error)
    assert least(instance_of(with_parts(sites, worse), asked)) >= before
    tired = list(sites)
    tired[2] = dataclasses.replace(sites[2], t1_us=20.0, t2_us=15.0)
    assert least(instance_of(with_parts(tired, links), asked)) >= before


def test_one_more_recipe_or_step_of_choice_is_never_dearer() -> None:
    instance = drawn(6, "grid6", is_uneven=True)
    widest = everything(instance)
    best = least(instance)
    for c in range(max(len(row) for row in widest.recipes)):
        narrow = tuple((row[min(c, len(row) - 1)],) for row in widest.recipes)
        choice = Open(widest.sites, narrow, widest.slot_sites)
        found = solve(instance, choice, work=2.0, seed=0)
        assert found.cost is None or found.cost >= best


def test_symmetries_of_known_graphs() -> None:
    # Equal figures: a line of n has 2, a ring of n has 2n, a 2 x 3 grid 4, 3 x 3 has 8.
    expected = {"line6": 2, "ring6": 12, "grid6": 4, "grid9": 8}
    orbits = {"line6": 3, "ring6": 1, "grid6": 2, "grid9": 3}
    for name, count in expected.items():
        even = symmetries(drawn(0, name, is_uneven=False))
        assert len(even) == count
        assert even[0] == tuple(range(len(even[0])))
        assert len(representatives(even)) == orbits[name]
        uneven = symmetries(drawn(0, name, is_uneven=True))
        assert uneven == [tuple(range(len(uneven[0])))]


@pytest.mark.parametrize("name", ["line6", "grid6"])
def test_step_tables_equal_the_least_over_all_slots(name: str) -> None:
    # Where slots are placed together the cost is exact: compare every place of the
    # operands with a plain loop over the slots.
    instance = drawn(1, name, is_uneven=True)
    step = max(range(instance.steps), key=lambda i: len(instance.operands[i]))
    for profile in instance.profiles[step]:
        cost, length = least_over_slots(profile, reach_of(instance, profile))
        draw = np.random.default_rng(0)
        for _ in range(20):
            where = draw.permutation(len(instance.usable))[: cost.ndim]
            assert cost[tuple(where)] == slow_least(instance, profile, where)
            assert length[tuple(where)] >= profile.base_ns


def slow_least(instance: Instance, profile, where) -> int:  # type: ignore[no-untyped-def]
    slots = len(profile.built.slots)
    free = [p for p in instance.usable if p not in where]
    totals = [NEVER]
    for chosen in itertools.permutations(free, slots):
        sites = (*(int(p) for p in where), *chosen)
        total = step_cost(instance, profile, sites)
        for slot, site in enumerate(chosen):
            if profile.built.slots[slot] == "clean":
                total += int(instance.tables.prep[site])
                total += int(instance.tables.rate[site]) * profile.live_ns[slot]
        totals.append(total)
    return min(totals)
