"""Routes and timelines against a plain follower and values worked out by hand."""

from __future__ import annotations

import dataclasses
import itertools
import math
import random
import time

import networkx as nx
import numpy as np
import pytest
from placed_samples import (
    grid,
    make_built,
    make_device,
    make_link,
    make_problem,
    make_register,
    make_site,
    plain_device,
)
from trial_reference import Follower, evaluate, fine_circuit

from placer.device.model import Level2, TGate
from placer.errors import InternalError
from placer.placed import place
from placer.recipes.circuit import Op
from placer.tables import device_tables
from placer.trial import Setting, figures, from_route, route, timeline

CX = make_built([Op("cx", (0, 1))], 2)
SETTINGS = [
    Setting(),
    Setting(lookahead=0, weight=0.0),
    Setting(lookahead=40, weight=1.0, care=0.0),
    Setting(lookahead=5, decay=0.05, care=1.0),
]


def choices_of(problem, sites, slot_sites=None, lenders=None):
    steps = len(problem.program.operations)
    slot_sites = slot_sites or [()] * steps
    lenders = lenders or [(None,) * len(s) for s in slot_sites]
    recipes = [c[0] for c in problem.choices]
    return problem, sites, recipes, slot_sites, list(range(steps)), lenders


def compare(choices, setting=SETTINGS[0], seed=1):
    """Route, follow both ways, compare everything; return the timeline."""
    problem = choices[0]
    tables = device_tables(problem.device)
    placed = place(*choices)
    found = route(placed, tables, setting=setting, seed=seed)
    assert found is not None
    line = timeline(placed, tables, found)
    truth = evaluate(*choices, found.gaps, found.swaps)
    assert line.costs == truth.costs
    assert line.time_ns == truth.time_ns
    assert line.touched == truth.sites
    assert line.swaps == len(found.swaps)
    assert line.start.tolist() == [op.start for op in truth.fine]
    assert line.end.tolist() == [op.end for op in truth.fine]
    wires = placed.wires
    for holder in range(placed.holders):
        if holder < wires:
            key = ("wire", holder, 0)
        else:
            key = ("lease", *placed.leases[holder - wires])
        assert line.share[holder] == pytest.approx(
            truth.shares.get(key, 0.0), rel=1e-12
        )
        assert line.stay[holder] == pytest.approx(truth.stays.get(key, 0.0), rel=1e-12)
    again = from_route(found.as_route(), placed)
    assert again.gap_of_gate.tolist() == found.gap_of_gate.tolist()
    assert found.moves_of_step.sum() == found.count
    for s in range(placed.steps):
        spans = [(o.start, o.end) for o in truth.fine if o.step == s]
        if spans:
            assert line.step_start[s] == min(a for a, _ in spans)
            assert line.step_end[s] == max(b for _, b in spans)
    gates = sum(
        getattr(line.costs, k)
        for k in ("two_qubit", "one_qubit", "measurement", "level2", "preparation")
    )
    assert line.step_cost.sum() + tables.prep[placed.fresh].sum() == gates
    assert line.swap_cost.sum() == line.costs.swaps
    assert line.decay_of_site.sum() == line.costs.decay
    return line


def random_built(rng: random.Random, operands: int, slots: tuple[str, ...]):
    """A circuit with every sort of operation, legal by construction."""
    width = operands + len(slots)
    ops, high, bits = [], None, 0
    level2_wires = set()
    for _ in range(rng.randint(4, 14)):
        others = [w for w in range(width) if w != high]
        pick = rng.random()
        condition = rng.randrange(bits) if bits and rng.random() < 0.4 else None
        if pick < 0.3:
            name = rng.choice(["h", "t", "tdg", "x", "rz"])
            ops.append(Op(name, (rng.choice(others),), condition=condition))
        elif pick < 0.6 and len(others) > 1:
            pair = tuple(rng.sample(others, 2))
            ops.append(Op(rng.choice(["cx", "cz"]), pair, condition=condition))
        elif pick < 0.68:
            ops.append(Op("measure", (rng.choice(others),), bit=bits))
            bits += 1
        elif pick < 0.74:
            ops.append(Op("reset", (rng.choice(others),)))
        elif pick < 0.78:
            some = tuple(rng.sample(range(width), rng.randint(1, width)))
            ops.append(Op("barrier", some))
        elif width > 1 and high is None:
            high, other = rng.sample(range(width), 2)
            level2_wires.add(high)
            ops.append(Op("level2", (high, other), action="x12", enters=(high,)))
        elif width > 1:
            pair = [high, rng.choice(others)]
            rng.shuffle(pair)
            leaves = (high,) if rng.random() < 0.6 else ()
            ops.append(Op("level2", tuple(pair), action="x12", leaves=leaves))
            high = None if leaves else high
    if high is not None:
        other = rng.choice([w for w in range(width) if w != high])
        ops.append(Op("level2", (other, high), action="x12", leaves=(high,)))
    return make_built(
        ops, operands, slots=slots, level2_wires=tuple(sorted(level2_wires))
    )


def uneven_device(rng: random.Random, edges, count: int):
    sites = [
        make_site(
            p,
            t1_us=rng.uniform(30, 200),
            t2_us=rng.uniform(20, 60),
            gate_error=rng.uniform(1e-5, 1e-3),
            gate_ns=rng.randint(10, 50),
            readout_error=rng.uniform(1e-3, 5e-2),
            readout_ns=rng.randint(200, 900),
            reset_ns=rng.randint(200, 900),
            level2=Level2(rng.uniform(20, 80), 1e-3, 40)
            if rng.random() < 0.85
            else None,
        )
        for p in range(count)
    ]
    links = [
        make_link(
            a,
            b,
            error=rng.uniform(1e-3, 3e-2),
            time_ns=rng.randint(60, 300),
            level2_error=high,
            level2_ns=None if high is None else rng.randint(200, 500),
        )
        for a, b in edges
        for high in [rng.uniform(5e-3, 5e-2) if rng.random() < 0.85 else None]
    ]
    tee = TGate(2e-3, 35) if rng.random() < 0.5 else None
    return make_device(sites, links, t_gate=tee)


def random_choices(seed: int):
    """Registers of every sort on a grid, leases of every sort, one step at a time."""
    rng = random.Random(seed)
    device = uneven_device(rng, grid(3, 4), 12)
    registers = [
        make_register("a", 3, 0),
        make_register("z", 2, 3, start="zero"),
        make_register("s", 2, 5, start="zero", workspace=True),
        make_register("u", 1, 7),
    ]
    wires, count = 8, rng.randint(3, 9)
    lists = [rng.sample(range(7), rng.randint(1, 3)) for _ in range(count)]
    held = []
    for s in range(count):
        now = {0, 1, 2, 7}
        for w in range(3, 7):
            uses = [k for k in range(count) if w in lists[k]]
            if uses and uses[0] <= s and (w < 5 or s <= uses[-1]):
                now.add(w)
        held.append(now)
    sites = rng.sample(range(12), wires)
    slot_sites, lenders, steps = [], [], []
    for s in range(count):
        kinds, places, who = [], [], []
        free = [p for p in range(12) if p not in {sites[w] for w in held[s]}]
        idle = [w for w in sorted(held[s]) if w not in lists[s]]
        for _ in range(rng.randint(0, 2)):
            kind = rng.choice(["clean", "borrowed"])
            if kind == "borrowed" and idle and rng.random() < 0.7:
                lender = idle.pop(rng.randrange(len(idle)))
                places.append(sites[lender])
                who.append(lender)
            elif free:
                places.append(free.pop(rng.randrange(len(free))))
                who.append(None)
            else:
                continue
            kinds.append(kind)
        steps.append((lists[s], random_built(rng, len(lists[s]), tuple(kinds))))
        slot_sites.append(tuple(places))
        lenders.append(tuple(who))
    problem = make_problem(device, registers, steps)
    return choices_of(problem, sites, slot_sites, lenders)


@pytest.mark.parametrize("seed", range(40))
def test_timeline_of_random_circuits_is_that_of_the_plain_follower(seed: int) -> None:
    compare(random_choices(seed), SETTINGS[seed % 4], seed)


def test_random_circuits_contain_everything() -> None:
    seen = {
        "lender": 0,
        "free": 0,
        "shared": 0,
        "high swap": 0,
        "condition": 0,
        "level 2": 0,
    }
    for seed in range(40):
        choices = random_choices(seed)
        placed, tables = place(*choices), device_tables(choices[0].device)
        found = route(placed, tables, setting=SETTINGS[0], seed=seed)
        line = timeline(placed, tables, found)
        a, b = found.swap_a, found.swap_b
        flat = [w for row in choices[5] for w in row]
        seen["lender"] += sum(w is not None for w in flat)
        seen["free"] += sum(w is None for w in flat)
        seen["shared"] += len(placed.leases) - len(set(placed.home[placed.wires :]))
        seen["condition"] += int((placed.flow.cause >= 0).sum())
        is_high = line.swap_cost == 3 * tables.two2[a, b]
        seen["high swap"] += int((is_high & (line.swap_cost > 0)).sum())
        seen["level 2"] += line.counts[6]
    assert all(count > 10 for count in seen.values()), seen


def line_device(count: int, **figures):
    return plain_device(count, [(p, p + 1) for p in range(count - 1)], **figures)


def test_a_swap_by_hand() -> None:
    """Wires on sites 0 and 2 of a line: one swap, then the gate.

    The swap takes 300 ns, the gate 100; the wire that is not swapped waits 300.
    """
    problem = make_problem(line_device(3), [make_register("q", 2, 0)], [((0, 1), CX)])
    line = compare(choices_of(problem, [0, 2]))
    assert (line.swaps, line.time_ns, line.touched) == (1, 400, 3)
    gate = math.ceil(-math.log1p(-5e-3) * 1e12)
    assert line.costs.two_qubit == gate
    assert line.costs.swaps == 3 * gate
    waited = (1 + math.exp(-0.3 / 100) + 2 * math.exp(-0.3 / 80)) / 4
    assert line.costs.decay == pytest.approx(-math.log(waited) * 1e12, abs=1)


def test_a_measured_wire_and_a_reset_wire_are_not_charged_for_waiting() -> None:
    measure = make_built([Op("measure", (0,), bit=0)], 1, kind="measure")
    reset = make_built([Op("reset", (0,))], 1, kind="reset")
    wait = make_built([Op("h", (0,))] * 100, 1)
    problem = make_problem(
        line_device(3),
        [make_register("q", 3, 0)],
        [((0,), measure), ((1,), reset), ((2,), wait)],
    )
    line = compare(choices_of(problem, [0, 1, 2]))
    assert line.time_ns == 2000
    assert line.costs.decay == 0


def test_condition_waits_for_its_measurement_and_the_latency() -> None:
    """Measured (500 ns), then 50 ns latency, then a 20 ns gate on the other wire."""
    fixed = make_built([Op("measure", (0,), bit=0), Op("z", (1,), condition=0)], 2)
    problem = make_problem(
        line_device(2), [make_register("q", 2, 0)], [((0, 1), fixed)]
    )
    line = compare(choices_of(problem, [0, 1]))
    assert line.time_ns == 570


def test_a_pending_condition_does_not_hold_up_swaps() -> None:
    """The gate before the measurement needs the wire in the middle to be moved."""
    ops = [
        Op("cx", (0, 2)),
        Op("measure", (2,), bit=0),
        Op("z", (1,), condition=0),
        Op("cx", (0, 1)),
    ]
    problem = make_problem(
        line_device(3), [make_register("q", 3, 0)], [((0, 1, 2), make_built(ops, 3))]
    )
    compare(choices_of(problem, [0, 1, 2]))


def test_figures_name_the_worst_value() -> None:
    slow = make_built(
        [Op("h", (1,)), Op("cx", (0, 1)), Op("t", (1,))], 1, slots=("clean",)
    )
    problem = make_problem(line_device(2), [make_register("q", 1, 0)], [((0,), slow)])
    choices = choices_of(problem, [0], [(1,)])
    line = compare(choices)
    shown = figures(line, ["q", "slot of step 0"])
    assert shown.worst_value == "slot of step 0"
    assert shown.worst_share == pytest.approx(140 / 80000)
    assert (shown.one_qubit_gates, shown.t_gates, shown.two_qubit_gates) == (2, 1, 1)
    assert shown.success == math.exp(-shown.costs.total / 1e12)
    assert all(
        type(v) in (int, float) for v in dataclasses.asdict(shown.costs).values()
    )


def test_bad_links_are_walked_around() -> None:
    """A ring of six: two links one way, one of them very bad; four good the other."""
    edges = [(p, (p + 1) % 6) for p in range(6)]
    device = make_device(
        [make_site(p) for p in range(6)],
        [make_link(a, b, error=0.6 if (a, b) == (0, 1) else 1e-3) for a, b in edges],
    )
    problem = make_problem(device, [make_register("q", 2, 0)], [((0, 1), CX)] * 3)
    choices = choices_of(problem, [0, 2])
    placed, tables = place(*choices), device_tables(device)
    found = route(placed, tables, setting=Setting(), seed=0)
    assert (0, 1) not in found.swaps
    assert timeline(placed, tables, found).costs.swaps < 0.6e12


def test_no_way_is_said() -> None:
    problem = make_problem(
        plain_device(4, [(0, 1), (2, 3)]), [make_register("q", 2, 0)], [((0, 1), CX)]
    )
    placed, tables = place(*choices_of(problem, [0, 2])), device_tables(problem.device)
    assert route(placed, tables, setting=Setting(), seed=0) is None


def test_no_level2_is_said() -> None:
    jump = make_built(
        [Op("level2", (0, 1), enters=(0,), leaves=(0,))], 2, level2_wires=(0,)
    )
    problem = make_problem(line_device(3), [make_register("q", 2, 0)], [((0, 1), jump)])
    placed, tables = place(*choices_of(problem, [0, 1])), device_tables(problem.device)
    assert route(placed, tables, setting=Setting(), seed=0) is None


def test_bad_routes_are_refused() -> None:
    problem = make_problem(
        line_device(3), [make_register("q", 2, 0)], [((0, 1), CX), ((1, 0), CX)]
    )
    placed, tables = place(*choices_of(problem, [0, 2])), device_tables(problem.device)
    good = route(placed, tables, setting=Setting(), seed=0)
    for swaps in ((0, 2), (1, 1)):
        bad = dataclasses.replace(
            good, swap_a=np.array([swaps[0]]), swap_b=np.array([swaps[1]])
        )
        with pytest.raises(InternalError, match="off"):
            timeline(placed, tables, bad)
    late = dataclasses.replace(good, gap_of_gate=np.array([1, 0]))
    with pytest.raises(InternalError, match="before what it needs"):
        timeline(placed, tables, late)
    with pytest.raises(InternalError, match="every two-body gate"):
        from_route(dataclasses.replace(good.as_route(), gaps=((), ((0, 0),))), placed)


def planted(rng: random.Random, edges, count: int, blocks: int):
    """A circuit whose least number of swaps is `blocks`, and its hidden placement.

    A vertex of largest degree meets all its neighbours and then one more, which takes
    a swap; blocks follow one another by chains of gates (rebuilt independently).
    """
    graph = nx.Graph(edges)
    top = max(d for _, d in graph.degree)
    triples = [
        (u, v, x)
        for u in sorted(graph)
        if graph.degree(u) == top
        for v in sorted(graph[u])
        for x in sorted(graph[v])
        if x != u and x not in graph[u]
    ]
    token_at = list(range(count))
    gates, last = [], None
    for _ in range(blocks):
        u, v, x = rng.choice(triples)
        if last is not None:
            path = nx.shortest_path(graph, last, u)
            gates += [(token_at[a], token_at[b]) for a, b in itertools.pairwise(path)]
        hub = token_at[u]
        gates += [(hub, token_at[n]) for n in sorted(graph[u])]
        token_at[u], token_at[v] = token_at[v], token_at[u]
        gates.append((hub, token_at[x]))
        last = v
    return gates


@pytest.mark.parametrize("blocks", [1, 2, 4])
def test_planted_swaps_are_at_least_what_was_planted(blocks: int) -> None:
    rng = random.Random(blocks)
    edges = grid(4, 4)
    gates = planted(rng, edges, 16, blocks)
    problem = make_problem(
        plain_device(16, edges), [make_register("q", 16, 0)], [(g, CX) for g in gates]
    )
    counts = []
    for seed in range(4):
        choices = choices_of(problem, list(range(16)))
        placed, tables = place(*choices), device_tables(problem.device)
        found = route(placed, tables, setting=SETTINGS[0], seed=seed)
        Follower(problem, fine_circuit(*choices), found.gaps, found.swaps)
        counts.append(found.count)
        scattered = rng.sample(range(16), 16)
        other = route(
            place(*choices_of(problem, scattered)),
            tables,
            setting=SETTINGS[0],
            seed=seed,
        )
        assert other.count >= blocks
    assert min(counts) >= blocks
    assert min(counts) <= 1.5 * blocks


def test_two_far_tokens_on_a_path_take_the_known_number_of_swaps() -> None:
    """A gate at distance d on a path takes d - 1 swaps, on a complete graph none."""
    for far in (2, 5, 9):
        problem = make_problem(
            line_device(10), [make_register("q", 2, 0)], [((0, 1), CX)]
        )
        assert compare(choices_of(problem, [0, far])).swaps == far - 1
    edges = [(a, b) for a in range(6) for b in range(a + 1, 6)]
    gates = [((a, b), CX) for a, b in edges]
    problem = make_problem(plain_device(6, edges), [make_register("q", 6, 0)], gates)
    assert compare(choices_of(problem, list(range(6)))).swaps == 0


def test_reversing_all_neighbours_takes_at_least_the_inversions() -> None:
    """All pairs of a path meet: a token swapping argument needs swaps in between.

    On a path of n every pair has to be adjacent once; m gates of distinct pairs need
    at least (pairs - (n - 1)) swaps, since one swap makes at most two new pairs
    adjacent that were not: ceil of half.
    """
    for count in (4, 6):
        edges = [(a, b) for a in range(count) for b in range(a + 1, count)]
        problem = make_problem(
            line_device(count),
            [make_register("q", count, 0)],
            [(e, CX) for e in edges],
        )
        line = compare(choices_of(problem, list(range(count))))
        pairs = count * (count - 1) // 2
        assert line.swaps >= math.ceil((pairs - (count - 1)) / 2)
        assert line.swaps <= 3 * pairs


@pytest.mark.parametrize("setting", SETTINGS)
def test_the_same_seed_gives_the_same_route(setting: Setting) -> None:
    rng = random.Random(5)
    device = uneven_device(rng, grid(4, 5), 20)
    gates = [(tuple(rng.sample(range(16), 2)), CX) for _ in range(150)]
    problem = make_problem(device, [make_register("q", 16, 0)], gates)
    choices = choices_of(problem, rng.sample(range(20), 16))
    placed, tables = place(*choices), device_tables(device)
    routes = [route(placed, tables, setting=setting, seed=s) for s in (1, 2, 1)]
    assert routes[0].swaps == routes[2].swaps
    assert routes[0].gaps == routes[2].gaps
    for found in routes:
        Follower(problem, fine_circuit(*choices), found.gaps, found.swaps)


def test_links_without_error_still_lead_somewhere() -> None:
    rng = random.Random(2)
    problem = make_problem(
        plain_device(16, grid(4, 4), error=0.0),
        [make_register("q", 10, 0)],
        [(tuple(rng.sample(range(10), 2)), CX) for _ in range(60)],
    )
    for setting in SETTINGS:
        compare(choices_of(problem, list(range(10))), setting)


def test_an_empty_program_has_a_timeline() -> None:
    problem = make_problem(line_device(3), [make_register("q", 2, 0)], [])
    line = compare(choices_of(problem, [0, 1]))
    assert (line.time_ns, line.costs.total, line.touched) == (0, 0, 2)


@pytest.mark.parametrize("seed", range(6))
def test_level_2_in_crowded_places(seed: int) -> None:
    """Half of a line has level 2, and several wires are in it at once."""
    rng = random.Random(seed)
    rows = 2 if seed % 2 else 1
    count = 8 * rows
    edges = grid(rows, 8)
    high = (
        set(range(count // 2 + 1))
        if rows == 1
        else set(range(0, count, 2)) | set(range(8))
    )
    device = make_device(
        [
            make_site(p, level2=Level2(50.0, 1e-3, 40) if p in high else None)
            for p in range(count)
        ],
        [
            make_link(
                a,
                b,
                level2_error=0.01 if {a, b} <= high else None,
                level2_ns=300 if {a, b} <= high else None,
            )
            for a, b in edges
        ],
    )
    steps = []
    for _ in range(8):
        ops = [
            Op("level2", (0, 1), enters=(0,)),
            Op("level2", (1, 2), enters=(1,)),
            Op("level2", (0, 2)),
            Op("level2", (1, 2), leaves=(1,)),
            Op("level2", (0, 1), leaves=(0,)),
        ]
        wires = tuple(rng.sample(range(6), 3))
        steps.append((wires, make_built(ops, 3, level2_wires=(0, 1))))
        steps.append((tuple(rng.sample(range(6), 2)), CX))
    problem = make_problem(device, [make_register("q", 6, 0)], steps)
    compare(choices_of(problem, rng.sample(range(count), 6)), SETTINGS[seed % 4], seed)


@pytest.mark.bench
def test_a_long_route_is_quick() -> None:
    rng = random.Random(1)
    side = 21
    device = plain_device(side * side, grid(side, side))
    gates = []
    for _ in range(100_000):
        a = rng.randrange(200)
        b = min(199, max(0, a + rng.choice([-3, -2, -1, 1, 2, 3])))
        gates.append(((a, b if b != a else (a + 5) % 200), CX))
    problem = make_problem(device, [make_register("q", 200, 0)], gates)
    snake = [
        r * side + (c if r % 2 == 0 else side - 1 - c)
        for r in range(side)
        for c in range(side)
    ]
    choices = choices_of(problem, snake[:200])
    placed, tables = place(*choices), device_tables(device)
    timeline(placed, tables, route(placed, tables, setting=SETTINGS[0], seed=1))
    begin = time.perf_counter()
    found = route(placed, tables, setting=SETTINGS[0], seed=2)
    routed = time.perf_counter()
    timeline(placed, tables, found)
    assert routed - begin < 5.0
    assert time.perf_counter() - routed < 0.5
