"""Where a circuit would like to start: route it to its end, and back again.

In: a placed circuit and a route of it.  Out: for every token a site to start from.
The way back begins where the way there ended, so that the first gates find their
tokens together (Li, Ding and Xie 2019, arXiv 1809.02573, section IV-C).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from placer.placed import LEVEL2, two_body_circuit
from placer.trial.router import route

if TYPE_CHECKING:
    from placer.placed import Ints, PlacedCircuit
    from placer.tables import Tables
    from placer.trial.router import RouteResult, Setting


def there_and_back(
    placed: PlacedCircuit,
    tables: Tables,
    there: RouteResult,
    *,
    setting: Setting,
    seed: int,
) -> Ints | None:
    """Return the site from which each token should start, `None` for no way back.

    Circuits with level-2 gates are left alone: where their tokens may be depends on
    the time.
    """
    if bool(np.any(placed.flow.code[placed.gates] == LEVEL2)):
        return None
    ends = followed(placed.sites, there)
    at = placed.flow.first[placed.gates]
    one, two = placed.flow.token[at], placed.flow.token[at + 1]
    # A token of the way back bears the number of the site where it starts.
    mirror = two_body_circuit(ends[one][::-1], ends[two][::-1], placed.sites)
    back = route(mirror, tables, setting=setting, seed=seed)
    if back is None:
        return None
    return followed(placed.sites, back)[ends]


def followed(sites: int, route: RouteResult) -> Ints:
    """Return where each token is after all swaps of a route."""
    at = list(range(sites))
    for a, b in zip(route.swap_a.tolist(), route.swap_b.tolist(), strict=True):
        at[a], at[b] = at[b], at[a]
    place = np.empty(sites, dtype=np.int64)
    place[at] = np.arange(sites, dtype=np.int64)
    return place
