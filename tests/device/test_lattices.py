"""Shapes of the named coupling graphs."""

import networkx
import pytest

from placer.device import lattices
from placer.device.lattices import Lattice


def graph_of(lattice: Lattice) -> networkx.Graph:
    graph = networkx.Graph()
    graph.add_nodes_from(range(lattice.count))
    graph.add_edges_from(lattice.links)
    return graph


HEAVY_HEX_27 = lattices.heavy_hex(2, 11, offset=1, stubs=True)

ALL = {
    "line": lattices.line(12),
    "single site": lattices.line(1),
    "ring": lattices.ring(10),
    "odd ring": lattices.ring(3),
    "grid": lattices.grid(4, 5),
    "hexagonal": lattices.hexagonal(5, 6),
    "heavy-hex 27": HEAVY_HEX_27,
    "heavy-hex 65": lattices.heavy_hex(5, 11),
    "heavy-hex 127": lattices.heavy_hex(7, 15),
    "heavy-hex, even rows, other length": lattices.heavy_hex(4, 9, offset=3),
    "all-to-all": lattices.all_to_all(9),
}


@pytest.mark.parametrize("lattice", ALL.values(), ids=ALL)
def test_every_lattice_is_sorted_connected_and_drawable(lattice: Lattice) -> None:
    graph = graph_of(lattice)
    assert len(graph) == lattice.count == len(lattice.xy)
    assert list(lattice.links) == sorted(set(lattice.links))
    assert all(a < b for a, b in lattice.links)
    assert networkx.is_connected(graph)
    assert lattices.is_connected(range(lattice.count), lattice.links)
    assert len({(round(x, 6), round(y, 6)) for x, y in lattice.xy}) == lattice.count


@pytest.mark.parametrize(
    ("name", "links"),
    [
        ("line", 11),
        ("single site", 0),
        ("ring", 10),
        ("grid", 4 * 4 + 3 * 5),  # 4 links in each of 4 rows, 5 between two rows
        ("all-to-all", 36),
    ],
)
def test_number_of_links(name: str, links: int) -> None:
    assert len(ALL[name].links) == links


# Sizes of published heavy-hexagon machines, from memory; every one has
# sites + hexagons - 1 links, counted here by Euler's formula.
@pytest.mark.parametrize(
    ("lattice", "count", "hexagons"),
    [
        (HEAVY_HEX_27, 27, 2),
        (lattices.heavy_hex(5, 11), 65, 8),
        (lattices.heavy_hex(7, 15), 127, 18),
        (lattices.heavy_hex(13, 27), 433, 72),
        (lattices.heavy_hex(21, 43), 1121, 200),
    ],
)
def test_heavy_hex_sizes(lattice: Lattice, count: int, hexagons: int) -> None:
    graph = graph_of(lattice)
    assert lattice.count == count
    assert len(lattice.links) == count + hexagons - 1
    assert max(degree for _, degree in graph.degree) == 3
    assert networkx.is_bipartite(graph)
    assert networkx.is_connected(graph)
    is_planar, _ = networkx.check_planarity(graph)
    assert is_planar
    # Every shortest cycle is a hexagon with a site on each edge: 12 sites.
    assert networkx.girth(graph) == 12


def test_heavy_hex_127_has_two_loose_ends_and_27_has_six() -> None:
    def loose(lattice: Lattice) -> int:
        return sum(degree == 1 for _, degree in graph_of(lattice).degree)

    # The end of the first row and the start of the last one, a step past a bridge.
    assert loose(lattices.heavy_hex(7, 15)) == 2
    # Four stubs and the two row ends.
    assert loose(HEAVY_HEX_27) == 6


def test_hexagonal_is_made_of_hexagons() -> None:
    graph = graph_of(ALL["hexagonal"])
    assert networkx.girth(graph) == 6
    assert max(degree for _, degree in graph.degree) == 3
    assert networkx.is_bipartite(graph)
    assert networkx.check_planarity(graph)[0]
    # Drawn true to shape: every link is one unit long.
    spots = ALL["hexagonal"].xy
    for a, b in ALL["hexagonal"].links:
        (x, y), (u, v) = spots[a], spots[b]
        assert (x - u) ** 2 + (y - v) ** 2 == pytest.approx(1.0)


def test_grid_links_are_the_neighbours_on_the_drawing() -> None:
    lattice = lattices.grid(4, 5)
    near = {
        (a, b)
        for a in range(20)
        for b in range(a + 1, 20)
        if abs(a // 5 - b // 5) + abs(a % 5 - b % 5) == 1
    }
    assert set(lattice.links) == near


def test_listed_graph_keeps_its_spots_and_sorts_its_links() -> None:
    lattice = lattices.listed(3, [(2, 1), (1, 0)], [(0, 0), (1, 0), (5, 5)])
    assert lattice.links == ((0, 1), (1, 2))
    assert lattice.xy == ((0, 0), (1, 0), (5, 5))
    assert lattices.listed(3, []).xy == lattices.circle(3)


def test_parts_ignore_links_that_leave_the_sites() -> None:
    assert lattices.parts([4, 0, 1, 3], [(0, 1), (1, 2), (2, 3), (3, 4)]) == [
        [0, 1],
        [3, 4],
    ]
    assert lattices.is_connected([], [])
