"""Random damage to a plan file: an input error or findings, never a traceback."""

from __future__ import annotations

import copy
import json
from functools import lru_cache
from typing import Any

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import placer
from placer.check.verify import check_plan
from placer.errors import InputError

VALUES = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(-5, 10**13),
    st.floats(allow_nan=True, allow_infinity=True),
    st.text(max_size=5),
    st.just([]),
    st.just({}),
)


@lru_cache(maxsize=1)
def good() -> str:
    return placer.to_json(placer.plan("full-berths", "tuff-10", effort="quick"))


def places(data: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    found = [path] if path else []
    if isinstance(data, dict):
        for key in data:
            found += places(data[key], (*path, key))
    elif isinstance(data, list):
        for index, item in enumerate(data[:6]):
            found += places(item, (*path, index))
    return found


@settings(
    max_examples=150,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.too_slow],
)
@given(st.data())
def test_damage_is_survived_and_usually_noticed(data: st.DataObject) -> None:
    plan = json.loads(good())
    spoiled = copy.deepcopy(plan)
    path = data.draw(st.sampled_from(places(plan)))
    parent: Any = spoiled
    for key in path[:-1]:
        parent = parent[key]
    if data.draw(st.booleans()) and isinstance(parent, dict):
        del parent[path[-1]]
    else:
        parent[path[-1]] = data.draw(VALUES)
    try:
        result = check_plan(json.dumps(spoiled))
    except InputError:
        return
    watched = path[0] in ("calls", "route", "wires", "others", "figures")
    told = "lost" in path or "held_out" in path or "expected_swaps" in path
    if watched and not told and spoiled != plan:
        assert not result.ok, path


@settings(max_examples=100, deadline=None, derandomize=True)
@given(st.text(max_size=60))
def test_any_text_is_survived(text: str) -> None:
    try:
        assert not check_plan(text).ok
    except InputError:
        return
