"""One tiny problem per rule of the joint model, its least cost derived by hand.

Devices have figures that make sums easy: a gate costs `cost_of_error` of its error, a
site decays at `rate` per ns, a swap step costs three quarters of a link, rounded up.
"""

from __future__ import annotations

import dataclasses
import itertools
import math
from typing import Any

from placer.device.model import Budget, Capabilities, Device, Level2, Link, Site, SiteId
from placer.errors import Place
from placer.planner.joint import Answer, everything, solve
from placer.planner.model import Open
from placer.planner.placement import Instance, evaluate, make_instance
from placer.problem import make_problem
from placer.program.model import Operation, Program, Register, WireId
from placer.tables import device_tables
from placer.units import cost_of_error

T1_US = 100.0
T2_US = 100.0
# (1/T1 + 2/T2)/4 per us = 0.0075 per us = 7.5e-6 per ns = 7.5e6 units of 1e-12.
RATE = 7_500_000
ONE_NS, TWO_NS, READ_NS, RESET_NS = 20, 100, 500, 300
MOVE_NS = 75  # ceil(3 * 100 / 4)
ONE, READ, RESET, PREP = (cost_of_error(e) for e in (1e-4, 1e-2, 5e-3, 2e-3))
TWO = cost_of_error(5e-3)
STEP = math.ceil(3 * TWO / 4)

SITE = Site(
    id=SiteId(0),
    t1_us=T1_US,
    t2_us=T2_US,
    gate_error=1e-4,
    gate_ns=ONE_NS,
    readout_error=1e-2,
    readout_ns=READ_NS,
    reset_error=5e-3,
    reset_ns=RESET_NS,
    prep_error=2e-3,
    level2=None,
    in_service=True,
    xy=(0.0, 0.0),
)


def device(
    count: int,
    links: list[tuple[int, int]],
    errors: dict[tuple[int, int], float] | None = None,
    **changes: Any,
) -> Device:
    """Return equal sites; `changes` maps a site's number ('s2') to its differences."""
    sites = tuple(
        dataclasses.replace(SITE, id=SiteId(p), **changes.get(f"s{p}", {}))
        for p in range(count)
    )
    all_links = tuple(
        Link(SiteId(a), SiteId(b), (errors or {}).get((a, b), 5e-3), TWO_NS, None, None)
        for a, b in sorted(links)
    )
    return Device(
        name="tiny",
        note="",
        calibrated="2026-01-01",
        lattice="listed",
        sites=sites,
        links=all_links,
        capabilities=Capabilities(False, None, True),
        t_gate=None,
        budget=Budget(),
        text="",
        path="tiny",
        hash=repr((sites, all_links)),
        link_at={(k.a, k.b): k for k in all_links},
    )


def line(count: int, **changes: Any) -> Device:
    return device(count, [(p, p + 1) for p in range(count - 1)], **changes)


def program(wires: str, *steps: tuple[str, ...]) -> Program:
    """Return a program: u, z, w per wire (unknown, |0>, workspace), then its steps.

    A capital letter is a wire that must not be lent.
    """
    registers = tuple(
        Register(
            f"q{number}",
            1,
            True,
            "unknown" if letter in "uU" else "zero",
            letter == "w",
            letter.islower(),
            WireId(number),
            Place(""),
        )
        for number, letter in enumerate(wires)
    )
    kinds = {"cx": "gate", "h": "gate", "cz": "gate"}
    operations = tuple(
        Operation(
            index,
            kinds.get(name, name),  # type: ignore[arg-type]
            name if name in kinds or name in ("measure", "reset") else "call",
            tuple(WireId(int(w)) for w in on),
        )
        for index, (name, *on) in enumerate(steps)
    )
    return Program(
        name="tiny",
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
        path="tiny.qasm",
        hash=repr((wires, operations)),
        register_of=tuple(range(len(wires))),
    )


def instance_of(
    on: Device, asked: Program, *, budget: Budget | None = None, recipe: str = ""
) -> Instance:
    problem = make_problem(on, asked, budget=budget or Budget(), goal="estimate")
    if recipe:
        choices = tuple(
            tuple(b for b in row if b.recipe == recipe) or row
            for row in problem.choices
        )
        problem = dataclasses.replace(problem, choices=choices)
    return make_instance(problem, device_tables(on))


def answer(instance: Instance, choice: Open | None = None) -> Answer:
    """Solve twice: by the solver alone, and by the walk that starts from its answer."""
    choice = choice or everything(instance)
    first = solve(instance, choice, work=20.0, seed=0)
    if first.placement is not None:
        again = solve(instance, choice, work=20.0, seed=0, hint=first.placement)
        assert (again.status, again.cost) == ("best", first.cost)
    return first


def least(instance: Instance) -> int:
    found = answer(instance)
    assert found.status == "best"
    assert found.cost is not None
    return found.cost


def test_gates_and_decay_of_one_gate() -> None:
    # One cx on neighbours; both wires start unknown and decay over its 100 ns.
    assert least(instance_of(line(2), program("uu", ("cx", "0", "1")))) == (
        TWO + 2 * 100 * RATE
    )


def test_a_wire_in_zero_without_a_step_costs_nothing() -> None:
    # As above; the third wire never stays anywhere, so two sites are enough.
    asked = program("uuz", ("cx", "0", "1"))
    problem = make_problem(line(3), asked, goal="estimate")
    instance = make_instance(problem, device_tables(line(3)))
    assert least(instance) == TWO + 2 * 100 * RATE


def test_an_idle_wire_decays_to_the_end() -> None:
    # Three wires for 100 ns, though only two of them work.
    assert least(instance_of(line(3), program("uuu", ("cx", "0", "1")))) == (
        TWO + 3 * 100 * RATE
    )


def test_prepared_wires_pay_preparation() -> None:
    assert least(instance_of(line(2), program("zz", ("cx", "0", "1")))) == (
        TWO + 2 * 100 * RATE + 2 * PREP
    )


def test_distance_costs_moves_and_time() -> None:
    # Three wires in a circle of gates on a line: one pair is two links apart.
    # Cost: 3 gates and one step of a swap; time: 3 * 100 + 75, one after the other.
    asked = program("uuu", ("cx", "0", "1"), ("cx", "1", "2"), ("cx", "0", "2"))
    assert least(instance_of(line(3), asked)) == (
        3 * TWO + STEP + 3 * (3 * TWO_NS + MOVE_NS) * RATE
    )


def test_dear_links_are_avoided() -> None:
    # Links 0-1 at ten times the error, 1-2 plain: the gate happens on 1-2.
    on = line(3, errors={(0, 1): 5e-2})
    assert least(instance_of(on, program("uu", ("cx", "0", "1")))) == (TWO + 200 * RATE)


def test_bad_sites_are_avoided() -> None:
    # Two h on one wire: site 0 has one-qubit gates ten times worse, site 1 decays
    # twice as fast; site 2 is plain.
    on = line(3, s0={"gate_error": 1e-3}, s1={"t1_us": 50.0, "t2_us": 50.0})
    asked = program("u", ("h", "0"), ("h", "0"))
    # h is written in one-qubit gates of its lowering; count them from the profile.
    instance = instance_of(on, asked)
    ones = sum(sum(row[0].ones) for row in instance.profiles)
    assert least(instance) == ones * ONE + ones * ONE_NS * RATE


def test_steps_without_a_common_wire_run_side_by_side() -> None:
    # Two gates at once: four wires decay for 100 ns, not 200.
    asked = program("uuuu", ("cx", "0", "1"), ("cx", "2", "3"))
    assert least(instance_of(line(4), asked)) == 2 * TWO + 4 * 100 * RATE


def test_a_measured_wire_decays_until_it_is_measured() -> None:
    # cx, then wire 0 is measured (500 ns) while wire 1 waits for nothing: the program
    # ends with the readout.  Both pay 600 ns; measured first, wire 0 pays 500 only.
    asked = program("uu", ("cx", "0", "1"), ("measure", "0"))
    assert least(instance_of(line(2), asked)) == TWO + READ + 2 * 600 * RATE
    # Wire 1 measured too: side by side, the same length.
    both = program("uu", ("cx", "0", "1"), ("measure", "0"), ("measure", "1"))
    assert least(instance_of(line(2), both)) == TWO + 2 * READ + 2 * 600 * RATE
    # Reset early, then nothing: wire 2 pays 300 of the program's 600 ns.
    early = program("uuu", ("cx", "0", "1"), ("measure", "0"), ("reset", "2"))
    assert least(instance_of(line(3), early)) == (
        TWO + READ + RESET + (600 + 600 + 300) * RATE
    )


def test_a_wire_in_zero_starts_late() -> None:
    # Wire 1 (in |0>) meets 0 after 0's readout; alone it would start at 0.
    # cx(2,3) has no order with the rest: it ends with the program, at 600, so that
    # wires 2 and 3, in |0>, pay 100 ns each although they could start at 0.
    asked = program("uuzz", ("cx", "0", "1"), ("measure", "0"), ("cx", "2", "3"))
    instance = instance_of(line(4), asked)
    assert least(instance) == (
        2 * TWO + READ + 2 * PREP + (600 + 600 + 100 + 100) * RATE
    )
    placement = answer(instance).placement
    assert placement is not None
    assert placement.starts[2] == 500


def test_workspace_wires_take_turns_on_a_site() -> None:
    # On a star, 0 is the hub.  Wires w1 and w2 are workspace, one gate each with the
    # hub: with two sites in all they share the second one, one after the other.
    asked = program("uww", ("cx", "0", "1"), ("cx", "0", "2"))
    instance = instance_of(line(2), asked)
    assert least(instance) == 2 * TWO + 2 * PREP + (200 + 100 + 100) * RATE
    placement = answer(instance).placement
    assert placement is not None
    assert placement.sites[1] == placement.sites[2]


def test_permanent_wires_never_share() -> None:
    # Three wires that stay to the end on two sites: nothing is possible.
    asked = program("uuz", ("cx", "0", "1"), ("cx", "0", "2"))
    instance = instance_of(line(3), asked)
    two = tuple((0, 1) for _ in instance.wires)
    open_all = everything(instance)
    found = answer(instance, Open(two, open_all.recipes, open_all.slot_sites))
    assert found.status == "none"


LADDER = "clean-ladder"
V_CHAIN = "borrowed-v-chain"


def call_cost(instance: Instance, sites: tuple[int, ...]) -> tuple[int, int]:
    """Return cost and length of the only step's gates at given sites, re-derived.

    Counts the fine circuit gate by gate with breadth-first distances.
    """
    on = instance.problem.device
    hop = [[99] * len(on.sites) for _ in on.sites]
    for p in range(len(on.sites)):
        hop[p][p] = 0
    for _ in on.sites:
        for k in on.links:
            for p in range(len(on.sites)):
                hop[p][k.a] = min(hop[p][k.a], hop[p][k.b] + 1)
                hop[p][k.b] = min(hop[p][k.b], hop[p][k.a] + 1)
    built = instance.problem.choices[0][0]
    free = [0] * built.fine.width
    cost, moves = 0, 0
    for op in built.fine.ops:
        if len(op.wires) == 2:
            away = hop[sites[op.wires[0]]][sites[op.wires[1]]] - 1
            cost += TWO + away * STEP
            moves += away
        else:
            cost += ONE
        end = max(free[w] for w in op.wires)
        end += TWO_NS if len(op.wires) == 2 else ONE_NS
        for w in op.wires:
            free[w] = end
    return cost, max(free) + moves * MOVE_NS


def best_call(instance: Instance, places: Any, extra: Any) -> int:
    """Return the least of gates, decay of four wires, and what a slot adds."""
    totals = []
    for sites in places:
        cost, length = call_cost(instance, sites)
        totals.append(cost + 4 * length * RATE + extra)
    return min(totals)


def places_of(count: int, wires: int) -> Any:
    return itertools.permutations(range(count), wires)


def test_a_clean_slot_pays_preparation_and_its_own_decay() -> None:
    asked = program("uuuu", ("mcx", "0", "1", "2", "3"))
    instance = instance_of(device(5, STAR), asked, recipe=LADDER)
    live = instance.profiles[0][0].live_ns[0]
    expected = best_call(instance, places_of(5, 5), PREP + live * RATE)
    assert least(instance) == expected


STAR = [(0, 1), (0, 2), (0, 3), (0, 4)]


def test_a_borrowed_slot_on_an_idle_wire_adds_no_decay() -> None:
    # Five wires hold all five sites: the slot sits on the idle one, which pays itself.
    asked = program("uuuuu", ("mcx", "0", "1", "2", "3"))
    instance = instance_of(device(5, STAR), asked, recipe=V_CHAIN)
    totals = []
    for sites in places_of(5, 5):
        cost, length = call_cost(instance, sites)
        totals.append(cost + 5 * length * RATE)
    assert least(instance) == min(totals)
    placement = answer(instance).placement
    assert placement is not None
    assert evaluate(instance, placement).lenders == ((4,),)


def test_a_wire_that_must_not_be_lent_is_not_lent() -> None:
    asked = program("uuuuU", ("mcx", "0", "1", "2", "3"))
    instance = instance_of(device(5, STAR), asked, recipe=V_CHAIN)
    assert answer(instance).status == "none"


def test_a_clean_slot_needs_a_site_that_no_wire_holds() -> None:
    asked = program("uuuuu", ("mcx", "0", "1", "2", "3"))
    instance = instance_of(device(6, [*STAR, (0, 5)]), asked, recipe=LADDER)
    open_all = everything(instance)
    on_five = tuple(tuple(range(5)) for _ in range(5))
    crowded = Open(on_five, open_all.recipes, (tuple(range(5)),))
    assert answer(instance, crowded).status == "none"
    placement = answer(instance).placement
    assert placement is not None
    assert placement.slot_sites[0][0] not in placement.sites


def test_two_leases_on_one_site_take_turns() -> None:
    # Two calls without a common wire and one free site: in turn, not side by side.
    asked = program(
        "uuuuuuuu", ("mcx", "0", "1", "2", "3"), ("mcx", "4", "5", "6", "7")
    )
    links = [(a, b) for a in range(9) for b in range(a + 1, 9)]
    instance = instance_of(device(9, links), asked, recipe=LADDER)
    profile = instance.profiles[0][0]
    # A T gate costs what a one-qubit gate costs: the device does not price it.
    cost = sum(p.count for p in profile.pairs) * TWO
    cost += (sum(profile.ones) + sum(profile.tees)) * ONE
    cost += PREP + profile.live_ns[0] * RATE
    # All sites are linked: no moves.  Eight wires decay over both calls.
    assert least(instance) == 2 * cost + 8 * 2 * profile.base_ns * RATE
    # A tenth site lets them run side by side.
    more = [(a, b) for a in range(10) for b in range(a + 1, 10)]
    instance = instance_of(device(10, more), asked, recipe=LADDER)
    assert least(instance) == 2 * cost + 8 * profile.base_ns * RATE


def test_level2_gates_need_their_links_and_sites() -> None:
    # Only link 1-2 has a level-2 gate, only sites 1 and 2 offer level 2.
    high = Level2(50.0, 1e-3, 40)
    on = line(3, s1={"level2": high}, s2={"level2": high})
    links = tuple(
        dataclasses.replace(k, level2_error=1e-2, level2_ns=120) if k.a == 1 else k
        for k in on.links
    )
    on = dataclasses.replace(
        on, links=links, link_at={(k.a, k.b): k for k in links}, hash=repr(links)
    )
    asked = program("uuu", ("mcz", "0", "1", "2"))
    instance = instance_of(on, asked, recipe="level2-chain")
    found = answer(instance)
    assert found.status == "best"
    assert found.placement is not None
    profile = instance.profiles[0][0]
    held = [w for w, ns in enumerate(profile.level2_ns) if ns]
    assert held
    for local in held:
        assert found.placement.sites[int(asked.operations[0].wires[local])] in (1, 2)
    # Nothing offers level 2 where the wires must sit: no plan.
    open_all = everything(instance)
    outside = Open(((0,), (0,), (0,)), open_all.recipes, open_all.slot_sites)
    assert answer(instance, outside).status == "none"


def test_limits_on_sites_and_time() -> None:
    # The call's clean slot needs a fifth site; without it there is the same call
    # with no workspace, dearer.
    asked = program("uuuu", ("mcx", "0", "1", "2", "3"))
    links = [(a, b) for a in range(5) for b in range(a + 1, 5)]
    free = instance_of(device(5, links), asked)
    tight = instance_of(device(5, links), asked, budget=Budget(most_sites=4))
    assert least(free) < least(tight)
    placement = answer(tight).placement
    assert placement is not None
    assert placement.slot_sites == ((),)
    shortest = min(profile.base_ns for profile in free.profiles[0])
    for limit, status in ((shortest, "best"), (shortest - 1, "none")):
        limited = instance_of(device(5, links), asked, budget=Budget(longest_ns=limit))
        assert answer(limited).status == status


def test_a_hint_beyond_the_limits_is_not_an_answer() -> None:
    asked = program("uu", ("cx", "0", "1"))
    free = answer(instance_of(line(2), asked)).placement
    limited = instance_of(line(2), asked, budget=Budget(longest_ns=TWO_NS - 1))
    found = solve(limited, everything(limited), work=5.0, seed=0, hint=free)
    assert found.status == "none"
