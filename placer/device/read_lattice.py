"""The `lattice` of a device file: a named coupling graph or a list of links.

Gives a `Lattice`, or `None` after faults were added.  Also reads what names a site:
numbers, lists of numbers, pairs such as `3-4`.
"""

from __future__ import annotations

import bisect
import re
from collections.abc import Callable

from placer.device import lattices
from placer.device.lattices import Lattice, Pair
from placer.yamltext import Faults, Node

MOST_SITES = 20_000
_MOST_ALL_TO_ALL = 1_000  # half a million links

_REQUIRED = {
    "line": ("sites",),
    "ring": ("sites",),
    "grid": ("rows", "columns"),
    "hexagonal": ("rows", "columns"),
    "heavy-hex": ("rows", "row_length"),
    "all-to-all": ("sites",),
    "listed": ("sites", "links"),
}
_OPTIONAL = {"heavy-hex": ("offset", "stubs"), "listed": ("xy",)}
_LEAST = {
    ("line", "sites"): 1,
    ("ring", "sites"): 3,
    ("heavy-hex", "rows"): 2,
    ("heavy-hex", "row_length"): 5,
    ("hexagonal", "columns"): 2,
}
_LINK_KEY = re.compile(r"(0|[1-9][0-9]{0,8})-(0|[1-9][0-9]{0,8})")


def read_lattice(faults: Faults, node: Node) -> Lattice | None:
    """Return the coupling graph, or `None` after faults."""
    before = len(faults)
    first = node.mapping(faults, required=("kind",))
    if first is None or "kind" not in first:
        return None
    kind = first["kind"].choice(faults, tuple(_REQUIRED))
    if kind is None:
        return None
    needed = _REQUIRED[kind]
    keys = ("kind", *needed, *_OPTIONAL.get(kind, ()))
    fields = node.mapping(faults, keys=keys, required=needed) or {}
    sizes = {
        name: fields[name].whole(
            faults, low=_LEAST.get((kind, name), 1), high=_most(kind)
        )
        for name in ("sites", "rows", "columns", "row_length")
        if name in fields
    }
    numbers: dict[str, int] = {
        name: size for name, size in sizes.items() if size is not None
    }
    if len(numbers) < len([name for name in needed if name != "links"]):
        return None
    if _count(kind, numbers) > MOST_SITES:
        node.fault(
            faults,
            "too-large",
            f"the lattice has more than {MOST_SITES} sites",
        )
        return None
    lattice = _build(faults, kind, fields, numbers)
    return lattice if len(faults) == before else None


def _most(kind: str) -> int:
    return _MOST_ALL_TO_ALL if kind == "all-to-all" else MOST_SITES


def _count(kind: str, numbers: dict[str, int]) -> int:
    """Return the number of sites, for the lattice of hexagons from above."""
    if kind == "heavy-hex":
        return numbers["rows"] * (numbers["row_length"] + numbers["row_length"] // 4)
    return numbers.get("sites", 1) * numbers.get("rows", 1) * numbers.get("columns", 1)


def _build(
    faults: Faults, kind: str, fields: dict[str, Node], numbers: dict[str, int]
) -> Lattice | None:
    if kind == "listed":
        return _listed(faults, fields, numbers["sites"])
    if kind == "heavy-hex":
        offset = (
            fields["offset"].whole(faults, low=0, high=3) if "offset" in fields else 0
        )
        stubs = fields["stubs"].flag(faults) if "stubs" in fields else False
        if offset is None or stubs is None:
            return None
        return lattices.heavy_hex(
            numbers["rows"], numbers["row_length"], offset=offset, stubs=stubs
        )
    chains: dict[str, Callable[[int], Lattice]] = {
        "line": lattices.line,
        "ring": lattices.ring,
        "all-to-all": lattices.all_to_all,
    }
    if kind in chains:
        return chains[kind](numbers["sites"])
    shape = lattices.grid if kind == "grid" else lattices.hexagonal
    return shape(numbers["rows"], numbers["columns"])


def _listed(faults: Faults, fields: dict[str, Node], count: int) -> Lattice | None:
    if "links" not in fields:
        return None
    links: list[Pair] = []
    known: dict[Pair, int] = {}
    for node in fields["links"].sequence(faults) or ():
        pair = _listed_link(faults, node, count)
        if pair is None:
            continue
        if pair in known:
            node.fault(
                faults,
                "repeated-link",
                f"the link {pair[0]}-{pair[1]} is listed twice, first in line"
                f" {known[pair]}",
                "a link works in both directions; list it once",
            )
            continue
        known[pair] = node.place.line
        links.append(pair)
    spots = _spots(faults, fields["xy"], count) if "xy" in fields else None
    return lattices.listed(count, links, spots)


def _listed_link(faults: Faults, node: Node, count: int) -> Pair | None:
    ends = node.sequence(faults, least=2, most=2)
    if ends is None:
        return None
    a, b = (read_site(faults, end, count) for end in ends)
    if a is None or b is None:
        return None
    return _pair(faults, node, a, b)


def _pair(faults: Faults, node: Node, a: int, b: int) -> Pair | None:
    if a == b:
        node.fault(
            faults,
            "self-link",
            f"a link joins site {a} to itself",
            "a link needs two different sites",
        )
        return None
    return min(a, b), max(a, b)


def _spots(faults: Faults, node: Node, count: int) -> list[tuple[float, float]] | None:
    items = node.sequence(faults, least=count, most=count)
    spots = []
    for item in items or ():
        ends = item.sequence(faults, least=2, most=2) or ()
        numbers = [end.number(faults, low=-1e6, high=1e6) for end in ends]
        known = [number for number in numbers if number is not None]
        if len(known) == 2:
            spots.append((known[0], known[1]))
    return spots if len(spots) == count else None


def read_site(faults: Faults, node: Node, count: int) -> int | None:
    """Return the number of a site that exists."""
    site = node.whole(faults)
    if site is None:
        return None
    if not 0 <= site < count:
        node.fault(
            faults,
            "unknown-site",
            f"site {site} is unknown",
            f"the sites are 0 to {count - 1}",
        )
        return None
    return site


def read_sites(faults: Faults, node: Node, count: int) -> list[int]:
    """Return a list of different sites, sorted."""
    found: set[int] = set()
    for item in node.sequence(faults) or ():
        site = read_site(faults, item, count)
        if site is None:
            continue
        if site in found:
            item.fault(
                faults, "repeated-site", f"site {site} stands twice in {node.label}"
            )
        found.add(site)
    return sorted(found)


def read_link(faults: Faults, node: Node, lattice: Lattice) -> Pair | None:
    """Return the link that a key such as `3-4` names, if it exists."""
    match = _LINK_KEY.fullmatch(node.value) if node.is_scalar else None
    if match is None:
        node.fault(
            faults,
            "bad-link",
            f"{node.shown} does not name a link",
            "write the two sites with a hyphen, such as 3-4",
        )
        return None
    pair = _pair(faults, node, int(match[1]), int(match[2]))
    if pair is None:
        return None
    if pair[1] >= lattice.count:
        node.fault(
            faults,
            "unknown-site",
            f"site {pair[1]} is unknown",
            f"the sites are 0 to {lattice.count - 1}",
        )
        return None
    if not _has_link(lattice, pair):
        near = sorted(
            {site for link in lattice.links if pair[0] in link for site in link}
            - {pair[0]}
        )
        node.fault(
            faults,
            "unknown-link",
            f"there is no link {pair[0]}-{pair[1]} in the {lattice.words}",
            f"site {pair[0]} is linked with {', '.join(map(str, near)) or 'no site'}",
        )
        return None
    return pair


def _has_link(lattice: Lattice, pair: Pair) -> bool:
    spot = bisect.bisect_left(lattice.links, pair)
    return lattice.links[spot : spot + 1] == (pair,)
