"""Tables of a device against definitions worked out by hand and by brute force."""

from __future__ import annotations

import itertools
import time

import networkx as nx
import pytest
from placed_samples import grid, make_device, make_link, make_site

from placer.device.model import Level2, TGate
from placer.tables import FAR, FAR_COST, device_tables
from placer.units import cost_of_error

QUBIT = (False, False, False)


def test_nominal_figures_are_lower_medians_of_what_is_in_service() -> None:
    sites = [
        make_site(0, gate_ns=10, readout_ns=100),
        make_site(1, gate_ns=20, readout_ns=400),
        make_site(2, gate_ns=30, readout_ns=300),
        make_site(3, gate_ns=40, readout_ns=200),
        make_site(4, gate_ns=1, in_service=False),
    ]
    links = [
        make_link(0, 1, time_ns=50),
        make_link(1, 2, time_ns=70, level2_ns=90, level2_error=0.01),
        make_link(2, 3, time_ns=61),
        make_link(3, 4, time_ns=1),
    ]
    tables = device_tables(make_device(sites, links, conditional_ns=7))
    assert tables.one_ns == 20  # of 10 20 30 40
    assert tables.readout_ns == 200
    assert tables.two_ns == 61  # of 50 61 70: the fourth link is out of service
    assert tables.level2_ns == 90
    assert tables.move_ns == 46  # 3 * 61 / 4 = 45.75
    assert tables.conditional_ns == 7
    assert tables.tee_ns == 20
    assert tables.two[3, 4] == tables.two[4, 3] == -1
    assert tables.two2[0, 1] == -1
    assert tables.link2_ns[2, 1] == 90
    assert tables.hop[0, 4] >= FAR
    assert tables.moves[0, 4] >= FAR_COST


def test_costs_of_single_things() -> None:
    site = make_site(
        0,
        gate_error=1e-3,
        readout_error=2e-2,
        reset_error=3e-3,
        prep_error=4e-3,
        t1_us=100.0,
        t2_us=80.0,
        level2=Level2(50.0, 1e-3, 40),
    )
    device = make_device([site], [], t_gate=TGate(0.1, 9))
    tables = device_tables(device)
    assert tables.one[0] == 1000500334  # 1e12 * -ln(0.999) = 1000500333.58
    assert tables.tee[0] == 105360515658  # -ln(0.9) = 0.10536051565783
    assert (tables.read[0], tables.wipe[0], tables.prep[0]) == tuple(
        cost_of_error(e) for e in (2e-2, 3e-3, 4e-3)
    )
    # (1/100 + 2/80) / 4 per us = 0.00875 per us = 8.75e-6 per ns.
    assert tables.rate[0] == 8750000
    # 1/Tphi = 1/80 - 1/200 = 0.0075; (3 * 0.03 + 12 * 0.0075) / 9 = 0.02 per us.
    assert tables.rate2[0] == 20000000
    assert tables.tee_ns == 9
    assert tables.site_tee_ns[0] == 9
    assert tables.lifetime_ns[0] == 80000.0
    assert tables.level2_lifetime_ns[0] == 50000.0
    assert tables.two_ns == 0


def test_no_decay_costs_nothing() -> None:
    tables = device_tables(make_device([make_site(0, t1_us=None, t2_us=None)], []))
    assert tables.rate[0] == 0
    assert tables.rate2[0] == -1
    assert tables.lifetime_ns[0] == float("inf")


def uneven() -> object:
    """A 3 x 4 grid with unequal errors, level 2 on some sites and links."""
    sites = [
        make_site(p, level2=None if p in (0, 6, 9) else Level2(40.0, 1e-3, 40))
        for p in range(12)
    ]
    sites[5] = make_site(5, in_service=False)
    links = []
    for number, (a, b) in enumerate(grid(3, 4)):
        high = None if number % 3 == 0 else 0.002 + 0.001 * (number * 5 % 7)
        links.append(
            make_link(
                a,
                b,
                error=0.001 + 0.002 * (number * 7 % 11),
                level2_error=high,
                level2_ns=None if high is None else 300,
            )
        )
    return make_device(sites, links)


@pytest.mark.parametrize(
    "mask",
    [
        QUBIT,
        (True, False, False),
        (True, True, False),
        (True, False, True),
        (True, True, True),
    ],
)
def test_pair_is_the_least_over_all_fitting_links(mask: tuple[bool, ...]) -> None:
    device = uneven()
    tables = device_tables(device)
    graph = nx.Graph()
    graph.add_nodes_from(range(12))
    for link in device.links:
        if device.is_usable(link):
            cost = cost_of_error(link.error)
            graph.add_edge(link.a, link.b, step=(3 * cost + 3) // 4, cost=cost)
    steps = dict(nx.all_pairs_dijkstra_path_length(graph, weight="step"))
    hops = dict(nx.all_pairs_shortest_path_length(graph))
    pair, away = tables.pair(mask)
    for p, q in itertools.product(range(12), repeat=2):
        best, least = FAR_COST, FAR
        for link in device.links:
            if not device.is_usable(link):
                continue
            for u, v in ((link.a, link.b), (link.b, link.a)):
                error = link.level2_error if mask[0] else link.error
                lacks = (mask[1] and device.sites[u].level2 is None) or (
                    mask[2] and device.sites[v].level2 is None
                )
                if error is None or lacks or u not in steps[p] or q not in steps[v]:
                    continue
                best = min(best, steps[p][u] + cost_of_error(error) + steps[v][q])
                least = min(least, hops[p][u] + hops[v][q])
        assert (pair[p, q], away[p, q]) == (best, least)
        if q in hops[p]:
            assert tables.hop[p, q] == hops[p][q]
            assert tables.moves[p, q] == steps[p][q]


def test_turning_the_mask_round_turns_the_table_round() -> None:
    tables = device_tables(uneven())
    one, two = tables.pair((True, True, False)), tables.pair((True, False, True))
    assert (one[0] == two[0].T).all()
    assert (one[1] == two[1].T).all()


def test_tables_cannot_be_changed() -> None:
    tables = device_tables(uneven())
    with pytest.raises(ValueError, match="read-only"):
        tables.one[0] = 1
    with pytest.raises(ValueError, match="read-only"):
        tables.pair(QUBIT)[0][0, 0] = 1


@pytest.mark.bench
def test_tables_of_a_large_device_are_quick() -> None:
    size = 33
    device = make_device(
        [make_site(p) for p in range(size * size)],
        [make_link(a, b) for a, b in grid(size, size)],
    )
    device_tables(uneven()).pair(QUBIT)
    begin = time.perf_counter()
    device_tables(device).pair(QUBIT)
    assert time.perf_counter() - begin < 5.0
