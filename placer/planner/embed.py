"""Find sites on which every meeting already has its link: a zero-swap placement.

In: a pattern (who meets whom) and a target (which sites are linked), both as rows of
neighbours.  Out: a site for every vertex of the pattern, or nothing after so many
nodes.  Depth-first search on bitset domains, cut by distance balls and by the room
around what is placed, smallest domain on the frontier first, with restarts after
growing numbers of nodes (Luby et al. 1993).  Compiled by numba.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from placer.compiled import compiled, inner

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

RADIUS = 6
"""Distance up to which what is placed confines what is near it in the pattern."""
REACH = 12
"""Distance up to which the numbers of vertices around a vertex are compared."""


@dataclass(frozen=True, slots=True)
class Graph:
    """A graph as rows of neighbours: `others[offsets[v]:offsets[v + 1]]` are v's."""

    offsets: NDArray[np.int64]
    others: NDArray[np.int64]

    @property
    def count(self) -> int:
        """Number of vertices."""
        return len(self.offsets) - 1

    @property
    def degrees(self) -> NDArray[np.int64]:
        """Number of neighbours of each vertex."""
        return np.diff(self.offsets)


def graph_of(count: int, pairs: Sequence[tuple[int, int]]) -> Graph:
    """Return the graph of some pairs; each counts once, whatever its order."""
    rows: list[set[int]] = [set() for _ in range(count)]
    for a, b in pairs:
        rows[a].add(b)
        rows[b].add(a)
    offsets = np.cumsum([0, *(len(row) for row in rows)], dtype=np.int64)
    others = np.array([q for row in rows for q in sorted(row)], dtype=np.int64)
    return Graph(offsets, others)


def could_embed(pattern: Graph, target: Graph) -> bool:
    """Whether counts alone do not forbid an embedding."""
    want = np.sort(pattern.degrees)[::-1]
    have = np.sort(target.degrees)[::-1]
    return len(want) <= len(have) and bool(np.all(want <= have[: len(want)]))


def embed(
    pattern: Graph, target: Graph, *, nodes: int, seed: int
) -> NDArray[np.int64] | None:
    """Return a vertex of the target for every vertex of the pattern.

    Neighbours of the pattern are neighbours in the target; no vertex is used twice.
    `None` if none was found within so many nodes, or none exists.
    """
    if not could_embed(pattern, target):
        return None
    near, around = _balls(target)
    far, within = _distances(pattern)
    width = (target.count + 63) // 64
    fits = np.ones((pattern.count, target.count), dtype=np.bool_)
    for k in range(REACH):
        fits &= within[:, k][:, None] <= around[:, k][None, :]
    if not fits.any(axis=1).all():
        return None
    domains = _packed(fits, width)
    found: NDArray[np.int64] = _embed(
        pattern.offsets,
        pattern.others,
        far.offsets,
        far.others,
        far.distances,
        target.offsets,
        target.others,
        near,
        domains,
        _parts(pattern),
        nodes,
        seed,
    )
    return None if found[0] < 0 else found


@dataclass(frozen=True, slots=True)
class _Near:
    """For each vertex of the pattern those within RADIUS, with their distance."""

    offsets: NDArray[np.int64]
    others: NDArray[np.int64]
    distances: NDArray[np.int64]


def _levels(graph: Graph, start: int, depth: int) -> list[list[int]]:
    """Return the vertices at distance 0, 1, ... up to `depth`."""
    seen = {start}
    levels = [[start]]
    for _ in range(depth):
        following = []
        for v in levels[-1]:
            for u in graph.others[graph.offsets[v] : graph.offsets[v + 1]].tolist():
                if u not in seen:
                    seen.add(u)
                    following.append(u)
        levels.append(following)
    return levels


def _distances(pattern: Graph) -> tuple[_Near, NDArray[np.int64]]:
    """Return who is near whom, and how many are within each distance."""
    offsets = [0]
    others: list[int] = []
    distances: list[int] = []
    within = np.zeros((pattern.count, REACH), dtype=np.int64)
    for v in range(pattern.count):
        levels = _levels(pattern, v, REACH)
        within[v] = np.cumsum([len(level) for level in levels[1:]])
        for k in range(1, RADIUS + 1):
            others += levels[k]
            distances += [k] * len(levels[k])
        offsets.append(len(others))
    near = _Near(
        np.array(offsets, dtype=np.int64),
        np.array(others, dtype=np.int64),
        np.array(distances, dtype=np.int64),
    )
    return near, within


def _balls(target: Graph) -> tuple[NDArray[np.uint64], NDArray[np.int64]]:
    """Return where a path of each length may end, and how many sites are how near.

    A shortest path of the pattern becomes a path of the target, so it never turns
    back on the spot: its end is that of a walk of the same length that does not.
    """
    count = target.count
    rows = [
        target.others[target.offsets[p] : target.offsets[p + 1]].tolist()
        for p in range(count)
    ]
    ends = np.zeros((RADIUS + 1, count, count), dtype=np.bool_)
    around = np.zeros((count, REACH), dtype=np.int64)
    for p in range(count):
        levels = _levels(target, p, REACH)
        around[p] = np.cumsum([len(level) for level in levels[1:]])
        walks = {(p, q) for q in rows[p]}
        for k in range(1, RADIUS + 1):
            ends[k, p, [q for _, q in walks]] = True
            walks = {(q, r) for o, q in walks for r in rows[q] if r != o}
    width = (count + 63) // 64
    return np.stack([_packed(ends[k], width) for k in range(RADIUS + 1)]), around


def _packed(flags: NDArray[np.bool_], width: int) -> NDArray[np.uint64]:
    """Return rows of flags as bitsets, 64 flags to a word, the first one lowest."""
    wide = np.zeros((len(flags), width * 64), dtype=np.uint64)
    wide[:, : flags.shape[1]] = flags
    shifts = np.arange(64, dtype=np.uint64)
    words = wide.reshape(len(flags), width, 64) << shifts
    packed: NDArray[np.uint64] = np.bitwise_or.reduce(words, axis=2)
    return packed


def _parts(pattern: Graph) -> NDArray[np.int64]:
    """Return the size of the connected part that each vertex belongs to."""
    size = np.zeros(pattern.count, dtype=np.int64)
    for v in range(pattern.count):
        if size[v] == 0:
            part = [u for level in _levels(pattern, v, pattern.count) for u in level]
            size[part] = len(part)
    return size


@inner
def _next(state: Any) -> Any:
    # xorshift64*: small, seedable, the same on every platform.
    x = state[0]
    x ^= x >> np.uint64(12)
    x ^= x << np.uint64(25)
    x ^= x >> np.uint64(27)
    state[0] = x
    return x * np.uint64(2685821657736338717)


@inner
def _ones(word: Any) -> Any:
    """Return the number of ones of a word (Warren 2003, figure 5-2)."""
    x = word
    x = x - ((x >> np.uint64(1)) & np.uint64(0x5555555555555555))
    x = (x & np.uint64(0x3333333333333333)) + (
        (x >> np.uint64(2)) & np.uint64(0x3333333333333333)
    )
    x = (x + (x >> np.uint64(4))) & np.uint64(0x0F0F0F0F0F0F0F0F)
    return np.int64((x * np.uint64(0x0101010101010101)) >> np.uint64(56))


@inner
def _room(v: Any, domains: Any, taken: Any) -> Any:
    """Return the number of sites that a vertex may still take."""
    total = 0
    for w in range(domains.shape[1]):
        total += _ones(domains[v, w] & ~taken[w])
    return total


@inner
def _pick(place: Any, frontier: Any, domains: Any, taken: Any, parts: Any) -> Any:
    """Return the vertex to place: fewest sites on the frontier, else a new part."""
    best: Any = -1
    least: Any = np.int64(1) << np.int64(60)
    for v in range(place.shape[0]):
        if place[v] < 0 and frontier[v] > 0:
            room = _room(v, domains, taken)
            if room < least:
                best, least = v, room
    if best >= 0:
        return best
    largest: Any = 0
    for v in range(place.shape[0]):
        if place[v] < 0 and parts[v] >= largest:
            room = _room(v, domains, taken)
            if parts[v] > largest or room < least:
                best, least, largest = v, room, parts[v]
    return best


@inner
def _offers(
    v: Any, domains: Any, taken: Any, free: Any, needs: Any, row: Any, state: Any
) -> Any:
    """List the sites of a vertex, the tightest fit last; return how many."""
    count = 0
    for w in range(domains.shape[1]):
        word = domains[v, w] & ~taken[w]
        while word != np.uint64(0):
            low = word & (~word + np.uint64(1))
            row[count] = 64 * w + _ones(low - np.uint64(1))
            count += 1
            word ^= low
    for i in range(count - 1, 0, -1):
        k = np.int64((_next(state) >> np.uint64(33)) % np.uint64(i + 1))
        row[i], row[k] = row[k], row[i]
    # Insertion sort by spare room around the site, most spare first.
    for i in range(1, count):
        p = row[i]
        spare = free[p] - needs[v]
        j = i - 1
        while j >= 0 and free[row[j]] - needs[v] < spare:
            row[j + 1] = row[j]
            j -= 1
        row[j + 1] = p
    return count


@inner
def _assign(
    v: Any, p: Any, pattern: Any, near: Any, target: Any, balls: Any, place: Any,
    domains: Any, taken: Any, free: Any, needs: Any, trail: Any, owner: Any, top: Any,
) -> Any:  # fmt: skip
    """Place a vertex and confine those near it.

    Returns the top of the trail and a vertex that has no site left, -1 for none.
    """
    offsets, others = pattern
    near_offsets, near_others, near_distances = near
    t_offsets, t_others = target
    taken[p >> 6] |= np.uint64(1) << np.uint64(p & 63)
    place[v] = p
    for k in range(t_offsets[p], t_offsets[p + 1]):
        free[t_others[k]] -= 1
    for k in range(offsets[v], offsets[v + 1]):
        needs[others[k]] -= 1
    for k in range(near_offsets[v], near_offsets[v + 1]):
        u = near_others[k]
        if place[u] >= 0:
            continue
        distance = near_distances[k]
        owner[top] = u
        is_empty = True
        for w in range(domains.shape[1]):
            trail[top, w] = domains[u, w]
            domains[u, w] &= balls[distance, p, w]
            if domains[u, w] & ~taken[w] != np.uint64(0):
                is_empty = False
        top += 1
        if is_empty:
            return top, u
    return top, -1


@inner
def _blame(depth: Any, conflict: Any) -> None:
    """Add a depth to a set of depths."""
    conflict[depth >> 6] |= np.uint64(1) << np.uint64(depth & 63)


@inner
def _blame_near(
    u: Any, near: Any, place: Any, domains: Any, owner_of: Any, depth_of: Any,
    conflict: Any,
) -> None:  # fmt: skip
    """Blame all that confine a vertex, and all that sit where it could be."""
    near_offsets, near_others, _ = near
    for k in range(near_offsets[u], near_offsets[u + 1]):
        if place[near_others[k]] >= 0:
            _blame(depth_of[near_others[k]], conflict)
    for w in range(domains.shape[1]):
        word = domains[u, w]
        while word != np.uint64(0):
            low = word & (~word + np.uint64(1))
            other = owner_of[64 * w + _ones(low - np.uint64(1))]
            if other >= 0:
                _blame(depth_of[other], conflict)
            word ^= low


@inner
def _is_crowded(
    p: Any, target: Any, owner_of: Any, free: Any, needs: Any, depth_of: Any,
    conflict: Any,
) -> Any:  # fmt: skip
    """Whether a placed vertex at a site or beside it has too little room; blame it."""
    t_offsets, t_others = target
    for k in range(t_offsets[p] - 1, t_offsets[p + 1]):
        q = p if k < t_offsets[p] else t_others[k]
        u = owner_of[q]
        if u >= 0 and needs[u] > free[q]:
            _blame(depth_of[u], conflict)
            for j in range(t_offsets[q], t_offsets[q + 1]):
                other = owner_of[t_others[j]]
                if other >= 0:
                    _blame(depth_of[other], conflict)
            return True
    return False


@inner
def _undo(
    v: Any, pattern: Any, target: Any, place: Any, domains: Any, taken: Any,
    free: Any, needs: Any, trail: Any, owner: Any, top: Any, bottom: Any,
) -> None:  # fmt: skip
    """Take a vertex off its site again, and give back what it confined."""
    offsets, others = pattern
    t_offsets, t_others = target
    p = place[v]
    for k in range(t_offsets[p], t_offsets[p + 1]):
        free[t_others[k]] += 1
    for k in range(offsets[v], offsets[v + 1]):
        needs[others[k]] += 1
    for entry in range(top - 1, bottom - 1, -1):
        for w in range(domains.shape[1]):
            domains[owner[entry], w] = trail[entry, w]
    taken[p >> 6] &= ~(np.uint64(1) << np.uint64(p & 63))
    place[v] = -1


@inner
def _deepest(conflict: Any, depth: Any) -> Any:
    """Return the deepest of a set of depths that lies before a depth, -1 for none."""
    for d in range(depth - 1, -1, -1):
        if (conflict[d >> 6] >> np.uint64(d & 63)) & np.uint64(1):
            return d
    return -1


@inner
def _luby(i: Any) -> Any:
    """Return the i-th number of the sequence 1, 1, 2, 1, 1, 2, 4, ..., i from 1."""
    power = 1
    while power < i + 1:
        power *= 2
    while power - 1 != i:
        i = i - power // 2 + 1
        power = 1
        while power < i + 1:
            power *= 2
    return power // 2


@compiled
def _embed(  # noqa: C901, PLR0912, PLR0915 - one loop over one state
    offsets: Any, others: Any, near_offsets: Any, near_others: Any,
    near_distances: Any, t_offsets: Any, t_others: Any, balls: Any, first: Any,
    parts: Any, nodes: Any, seed: Any,
) -> Any:  # fmt: skip
    count, width = first.shape
    sites = t_offsets.shape[0] - 1
    pattern = (offsets, others)
    near = (near_offsets, near_others, near_distances)
    target = (t_offsets, t_others)
    state = np.array([np.uint64(seed) * np.uint64(7919) + np.uint64(88172645463325252)])
    longest = 0
    for v in range(count):
        longest += near_offsets[v + 1] - near_offsets[v]
    trail = np.zeros((longest + 1, width), dtype=np.uint64)
    owner = np.zeros(longest + 1, dtype=np.int64)
    spent = 0
    restart = 0
    place = np.full(count, -1, dtype=np.int64)
    depth_of = np.full(count, -1, dtype=np.int64)
    owner_of = np.full(sites, -1, dtype=np.int64)
    chosen = np.zeros(count + 1, dtype=np.int64)
    bottoms = np.zeros(count + 1, dtype=np.int64)
    left = np.zeros(count + 1, dtype=np.int64)
    rows = np.zeros((count + 1, sites), dtype=np.int64)
    frontier = np.zeros(count, dtype=np.int64)
    conflicts = np.zeros((count + 1, count // 64 + 1), dtype=np.uint64)
    while spent < nodes:
        restart += 1
        limit = spent + (20 * count + 100) * _luby(restart)
        domains = first.copy()
        taken = np.zeros(width, dtype=np.uint64)
        place[:] = -1
        owner_of[:] = -1
        frontier[:] = 0
        free = t_offsets[1:] - t_offsets[:-1]
        needs = offsets[1:] - offsets[:-1]
        depth = 0
        top = 0
        is_open = True
        while spent < limit:
            if is_open:
                if depth == count:
                    return place
                v = _pick(place, frontier, domains, taken, parts)
                chosen[depth] = v
                depth_of[v] = depth
                left[depth] = _offers(
                    v, domains, taken, free, needs, rows[depth], state
                )
                bottoms[depth] = top
                conflicts[depth] = np.uint64(0)
                _blame_near(
                    v, near, place, domains, owner_of, depth_of, conflicts[depth]
                )
                is_open = False
            v = chosen[depth]
            if place[v] >= 0:
                owner_of[place[v]] = -1
                for k in range(offsets[v], offsets[v + 1]):
                    frontier[others[k]] -= 1
                _undo(
                    v, pattern, target, place, domains, taken, free, needs, trail,
                    owner, top, bottoms[depth],
                )  # fmt: skip
                top = bottoms[depth]
            if left[depth] == 0:
                # Back to the deepest one that is to blame, past all others.
                back = _deepest(conflicts[depth], depth)
                if back < 0:
                    return np.full(count, -1, dtype=np.int64)
                for w in range(conflicts.shape[1]):
                    conflicts[back, w] |= conflicts[depth, w]
                conflicts[back, back >> 6] &= ~(np.uint64(1) << np.uint64(back & 63))
                depth -= 1
                while depth > back:
                    u = chosen[depth]
                    owner_of[place[u]] = -1
                    for k in range(offsets[u], offsets[u + 1]):
                        frontier[others[k]] -= 1
                    _undo(
                        u, pattern, target, place, domains, taken, free, needs, trail,
                        owner, top, bottoms[depth],
                    )  # fmt: skip
                    top = bottoms[depth]
                    depth -= 1
                continue
            left[depth] -= 1
            p = rows[depth, left[depth]]
            spent += 1
            top, empty = _assign(
                v, p, pattern, near, target, balls, place, domains, taken, free,
                needs, trail, owner, top,
            )  # fmt: skip
            owner_of[p] = v
            for k in range(offsets[v], offsets[v + 1]):
                frontier[others[k]] += 1
            if empty >= 0:
                _blame_near(
                    empty, near, place, domains, owner_of, depth_of, conflicts[depth]
                )
            elif not _is_crowded(
                p, target, owner_of, free, needs, depth_of, conflicts[depth]
            ):
                depth += 1
                is_open = True
    place[0] = -1
    return place
