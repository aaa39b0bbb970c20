"""Named coupling graphs: how many sites, which links, where to draw them.

Pure functions of a few numbers.  Sites count from 0; links are sorted pairs (a, b)
with a < b.  No figures of merit here, and no checks of user input: the reader does
that.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

Pair = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Lattice:
    """A coupling graph: its size, sorted links, a spot for every site, its words."""

    count: int
    links: tuple[Pair, ...]
    xy: tuple[tuple[float, float], ...]
    words: str


def line(count: int) -> Lattice:
    """Return sites in a row, each linked with the next."""
    links = [(site, site + 1) for site in range(count - 1)]
    spots = [(float(site), 0.0) for site in range(count)]
    return Lattice(count, tuple(links), tuple(spots), f"line of {count}")


def ring(count: int) -> Lattice:
    """Return sites on a circle, each linked with both neighbours; 3 or more."""
    links = [(site, site + 1) for site in range(count - 1)] + [(0, count - 1)]
    return Lattice(count, _sorted(links), circle(count), f"ring of {count}")


def grid(rows: int, columns: int) -> Lattice:
    """Return a square grid, numbered row by row."""
    links = []
    for row in range(rows):
        for column in range(columns):
            site = row * columns + column
            if column + 1 < columns:
                links.append((site, site + 1))
            if row + 1 < rows:
                links.append((site, site + columns))
    spots = [
        (float(column), float(row)) for row in range(rows) for column in range(columns)
    ]
    words = f"grid of {rows} x {columns}"
    return Lattice(rows * columns, _sorted(links), tuple(spots), words)


def hexagonal(rows: int, columns: int) -> Lattice:
    """Return a honeycomb of `rows` zigzag rows with `columns` sites each.

    Neighbours in a row are linked; sites of two rows are linked where row + column is
    even, so no site has more than three links.
    """
    links = []
    spots = []
    for row in range(rows):
        for column in range(columns):
            site = row * columns + column
            is_low = (row + column) % 2 == 0
            spots.append(
                (column * math.sqrt(3.0) / 2.0, row * 1.5 + (0.5 if is_low else 0.0))
            )
            if column + 1 < columns:
                links.append((site, site + 1))
            if is_low and row + 1 < rows:
                links.append((site, site + columns))
    words = f"hexagonal, {rows} rows of {columns}"
    return Lattice(rows * columns, _sorted(links), tuple(spots), words)


def heavy_hex(
    rows: int, row_length: int, *, offset: int = 0, stubs: bool = False
) -> Lattice:
    """Return hexagons with an extra site on every edge (Chamberland et al. 2020).

    Rows of `row_length` sites; between two rows a bridge site stands in every fourth
    column, from column `offset` in the first gap, two columns further in the next, and
    so on in turn.  The last site of the first row and the first site of the last row
    are left out where no bridge reaches them.  With `stubs` the bridges above the
    first and below the last row stay as loose ends.  Numbered from the top, each row
    before the bridges below it.

    (7, 15) has 127 sites, (13, 27) has 433, (21, 43) has 1121 and (2, 11) with offset 1
    and stubs is the pair of hexagons with 27 sites.
    C. Chamberland et al., Phys. Rev. X 10, 011022 (2020), arXiv 1907.09528.
    """
    # Rows are the odd levels, gaps with their bridges the even ones.
    levels = range(2 * rows + 1) if stubs else range(1, 2 * rows)
    bridges = {
        level: range((offset + level - 2) % 4, row_length, 4)
        for level in levels
        if level % 2 == 0
    }
    site_at: dict[tuple[int, int], int] = {}
    for level in levels:
        columns = bridges.get(level) or range(row_length)
        if level == 1 and not _is_bridged(bridges, level, row_length - 1):
            columns = columns[:-1]
        if level == 2 * rows - 1 and not _is_bridged(bridges, level, 0):
            columns = columns[1:]
        for column in columns:
            site_at[level, column] = len(site_at)
    links = []
    for (level, column), site in site_at.items():
        right, below = (level, column + 1), (level + 1, column)
        if level % 2 == 1 and right in site_at:
            links.append((site, site_at[right]))
        if below in site_at:
            links.append((site, site_at[below]))
    spots = [(float(column), float(level - 1)) for level, column in site_at]
    words = f"heavy-hex, {rows} rows of {row_length}"
    return Lattice(len(site_at), _sorted(links), tuple(spots), words)


def all_to_all(count: int) -> Lattice:
    """Return sites on a circle, every two of them linked."""
    links = [(a, b) for a in range(count) for b in range(a + 1, count)]
    return Lattice(count, tuple(links), circle(count), f"all-to-all, {count} sites")


def listed(
    count: int, links: Iterable[Pair], xy: Sequence[tuple[float, float]] | None = None
) -> Lattice:
    """Return any graph; without spots of its own it is drawn on a circle."""
    pairs = _sorted(links)
    spots = tuple(xy) if xy is not None else circle(count)
    return Lattice(count, pairs, spots, f"{count} sites, {len(pairs)} listed links")


def circle(count: int) -> tuple[tuple[float, float], ...]:
    """Return spots on a circle, about one unit apart, clockwise from the top."""
    radius = max(1.0, count / (2.0 * math.pi))
    turns = [2.0 * math.pi * site / count for site in range(count)]
    return tuple((radius * math.sin(t), -radius * math.cos(t)) for t in turns)


def is_connected(sites: Iterable[int], links: Iterable[Pair]) -> bool:
    """Whether links that stay inside a set of sites join all of it."""
    return len(parts(sites, links)) <= 1


def parts(sites: Iterable[int], links: Iterable[Pair]) -> list[list[int]]:
    """Return the connected parts of some sites, each sorted, by their first site."""
    near: dict[int, list[int]] = {site: [] for site in sorted(sites)}
    for a, b in links:
        if a in near and b in near:
            near[a].append(b)
            near[b].append(a)
    seen: set[int] = set()
    found = []
    for start in near:
        if start in seen:
            continue
        seen.add(start)
        part = [start]
        for site in part:  # grows while it is walked
            new = [other for other in near[site] if other not in seen]
            seen.update(new)
            part.extend(new)
        found.append(sorted(part))
    return found


def _is_bridged(bridges: dict[int, range], level: int, column: int) -> bool:
    """Whether a bridge above or below a row reaches one of its columns."""
    return any(column in bridges.get(near, ()) for near in (level - 1, level + 1))


def _sorted(links: Iterable[Pair]) -> tuple[Pair, ...]:
    return tuple(sorted((min(a, b), max(a, b)) for a, b in links))
