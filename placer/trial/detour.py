"""A straight way for one gate, where the search by scores does not move on.

In: where all tokens are, and one gate.  Out: swaps after which the gate is on a link
that fits.  What is in level 2 moves over capable links only, and stands in the way.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from placer.compiled import compiled, inner

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.placed import Flags, Ints
    from placer.tables import Tables


class Board(NamedTuple):
    """Usable links by site, and where the tokens are; see `search.py`."""

    starts: Ints
    neighbours: Ints
    capable: Flags
    hop: Ints
    at: Ints
    place: Ints
    high: Flags


def straight(
    tables: Tables, fits: Flags, place: Ints, one: int, two: int
) -> list[tuple[int, int]]:
    """Walk one token towards the other over the fewest and then the best links.

    An empty list means that no way was found.
    """
    a, b = int(place[one]), int(place[two])
    path: list[tuple[int, int]] = []
    if tables.hop[a, b] >= tables.far:
        return path
    while not fits[a, b]:
        links = range(int(tables.starts[a]), int(tables.starts[a + 1]))
        _, nearer = min(
            (int(tables.step[k]), int(tables.neighbours[k]))
            for k in links
            if tables.hop[tables.neighbours[k], b] < tables.hop[a, b]
        )
        path.append((a, nearer))
        a = nearer
    return path


@compiled
def around(board: Board, fits: Flags, one: int, two: int) -> Ints:
    """Return swaps that bring two tokens to a link that fits, among level-2 rules.

    An empty array means that no way was found.
    """
    path = _joint(board, fits, one, two, True)
    if len(path) > 0:
        return path
    return _crowded(board, fits, one, two)


@inner
def _joint(board: Board, fits: Flags, one: int, two: int, avoid: bool) -> Ints:
    """Return a shortest way of both tokens together, by breadth-first search.

    All other tokens count as staying where they are.  With `avoid` the way never
    displaces another token in level 2, so that it can be walked as it is.
    """
    sites = len(board.at)
    before = np.empty(sites * sites, dtype=np.int32)
    before[:] = -1
    line = np.empty(sites * sites, dtype=np.int32)
    begin = board.place[one] * sites + board.place[two]
    before[begin] = begin
    line[0] = begin
    head, tail = 0, 1
    while head < tail:
        here = line[head]
        head += 1
        p, q = here // sites, here % sites
        if fits[p, q]:
            return _walk_back(before, begin, here, sites)
        for side in range(2):
            a = p if side == 0 else q
            for link in range(board.starts[a], board.starts[a + 1]):
                n = board.neighbours[link]
                mover = one if side == 0 else two
                if not _may_move(board, link, n, mover, one, two, avoid):
                    continue
                after = _moved(p, q, side, n, sites)
                if before[after] < 0:
                    before[after] = here
                    line[tail] = after
                    tail += 1
    return np.empty((0, 2), dtype=np.int64)


@inner
def _may_move(
    board: Board, link: int, n: int, mover: int, one: int, two: int, avoid: bool
) -> bool:
    """Whether a token may be swapped over a link to site n."""
    other = board.at[n]
    if other in (one, two):
        # Who stands there now is known only of the other tokens: what has taken a
        # place of these two is in level 2 only where levels are not avoided.
        blocked = board.high[one] or board.high[two]
    else:
        blocked = board.high[other]
        if blocked and avoid:
            return False
    return board.capable[link] or not (blocked or board.high[mover])


@inner
def _moved(p: int, q: int, side: int, n: int, sites: int) -> int:
    """Return the places, as one number, after one of two tokens moves to n."""
    if n in (p, q):
        return q * sites + p
    return n * sites + q if side == 0 else p * sites + n


@inner
def _walk_back(before: NDArray[np.int32], begin: int, end: int, sites: int) -> Ints:
    """Return the swaps that lead from the begin to the end of a search."""
    length = 0
    here = end
    while here != begin:
        here = before[here]
        length += 1
    path = np.empty((length, 2), dtype=np.int64)
    here = end
    for k in range(length - 1, -1, -1):
        last = before[here]
        p, q = last // sites, last % sites
        a, b = here // sites, here % sites
        # The token that kept its place did not move; if both moved they changed places.
        path[k, 0], path[k, 1] = (q, b) if a == p else (p, a)
        here = last
    return path


@inner
def _crowded(board: Board, fits: Flags, one: int, two: int) -> Ints:
    """Find a way through other tokens in level 2, step by step on a copy."""
    at, place = board.at.copy(), board.place.copy()
    copy = Board(
        board.starts, board.neighbours, board.capable, board.hop,
        at, place, board.high,
    )  # fmt: skip
    room = 8 * len(at)
    path = np.empty((room, 2), dtype=np.int64)
    count = 0
    while not fits[place[one], place[two]]:
        way = _joint(copy, fits, one, two, True)
        if len(way) == 0:
            way = _joint(copy, fits, one, two, False)[:1]
        if len(way) == 0:
            way = _make_room(copy, one, two)
        if len(way) == 0 or count + len(way) > room:
            return np.empty((0, 2), dtype=np.int64)
        for k in range(len(way)):
            a, b = way[k, 0], way[k, 1]
            path[count, 0], path[count, 1] = a, b
            count += 1
            s, t = at[a], at[b]
            at[a], at[b] = t, s
            place[s], place[t] = b, a
    return path[:count]


@inner
def _make_room(board: Board, one: int, two: int) -> Ints:
    """Push what is in level 2 away from the rim of its sites, nearest to the gate.

    The rim are sites with a link that level 2 cannot take; only there can anything
    else come in, and only where the rim holds nothing in level 2.
    """
    best = len(board.at)
    chosen = np.empty((0, 2), dtype=np.int64)
    for site in range(len(board.at)):
        token = board.at[site]
        if not board.high[token] or token in (one, two):
            continue
        is_rim = False
        for link in range(board.starts[site], board.starts[site + 1]):
            is_rim = is_rim or not board.capable[link]
        near = min(board.hop[site, board.place[one]], board.hop[site, board.place[two]])
        if is_rim and near < best:
            way = _pull(board, site, one, two)
            if len(way) > 0:
                best, chosen = near, way
    return chosen


@inner
def _pull(board: Board, site: int, one: int, two: int) -> Ints:
    """Return swaps over capable links that bring something not in level 2 to a site."""
    sites = len(board.at)
    before = np.empty(sites, dtype=np.int64)
    before[:] = -1
    line = np.empty(sites, dtype=np.int64)
    before[site], line[0] = site, site
    head, tail = 0, 1
    while head < tail:
        here = line[head]
        head += 1
        token = board.at[here]
        if not board.high[token] and token != one and token != two:
            path = np.empty((sites, 2), dtype=np.int64)
            count = 0
            while here != site:
                path[count, 0], path[count, 1] = here, before[here]
                here = before[here]
                count += 1
            return path[:count]
        for link in range(board.starts[here], board.starts[here + 1]):
            n = board.neighbours[link]
            if board.capable[link] and before[n] < 0:
                before[n] = here
                line[tail] = n
                tail += 1
    return np.empty((0, 2), dtype=np.int64)
