"""Random damage to a plan file: an input error or findings, never a traceback."""

from __future__ import annotations

import copy
import json
from collections.abc import Callable
from functools import cache
from typing import Any

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import placer
from placer.check.verify import check_plan
from placer.errors import InputError
from tests.check.samples import sample

VALUES = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(-5, 10**13),
    st.floats(allow_nan=True, allow_infinity=True),
    st.text(max_size=5),
    st.just([]),
    st.just({}),
)


PLANS = ("berths", "clean", "level2", "measured", "plain", "scope")
# What a plan tells beside what it does: other recipes, held-out routes, expectations.
TOLD = {"lost", "held_out", "expected_swaps"}
DONE = ("calls", "others", "route", "wires", "figures")


@cache
def good(name: str) -> str:
    if name == "berths":
        return placer.to_json(placer.plan("full-berths", "tuff-10", effort="quick"))
    return sample(name)


def step_down(draw: Callable[..., Any], data: Any) -> list[Any]:
    """Return a random path into data, at least one step long."""
    path: list[Any] = []
    while isinstance(data, (dict, list)) and data:
        keys = sorted(data) if isinstance(data, dict) else range(len(data))
        path.append(draw(st.sampled_from(keys)))
        data = data[path[-1]]
        if draw(st.integers(0, 3)) == 0:
            break
    return path


def damage(draw: Callable[..., Any], parent: Any, key: Any) -> None:
    """Delete, replace, double, exchange, or shift one thing."""
    old = parent[key]
    kind = draw(st.sampled_from(["delete", "replace", "double", "exchange", "shift"]))
    if kind == "delete":
        del parent[key]
    elif kind == "double" and isinstance(parent, list):
        parent.insert(key, copy.deepcopy(old))
    elif kind == "exchange":
        keys = sorted(parent) if isinstance(parent, dict) else range(len(parent))
        other = draw(st.sampled_from(keys))
        parent[key], parent[other] = parent[other], old
    elif kind == "shift" and isinstance(old, (int, float)):
        parent[key] = old + draw(st.sampled_from([-1, 1, 2, 10**7]))
    elif kind == "shift" and isinstance(old, str):
        parent[key] = old[1:] + "x"
    else:
        parent[key] = draw(VALUES)


def substance_of(plan: Any) -> Any:
    """Return what a plan does, in one order.

    The order of rows says nothing, and swaps may come before or after gates on other
    sites: another order that passes is another spelling of the same route.
    """
    same = copy.deepcopy(plan)
    route = same["route"]
    runs = [run for gap in route["gaps"] for run in gap]
    gates = sorted(g for first, last in runs for g in range(first, last + 1))
    same["route"] = (gates, sorted(sorted(swap) for swap in route["swaps"]))
    for rows in ("calls", "others"):
        same[rows] = sorted(same[rows], key=str)
    for call in same["calls"]:
        call["lost"] = []
    return same


@settings(
    max_examples=250,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.too_slow],
)
@given(st.data())
def test_damage_is_survived_and_noticed(data: st.DataObject) -> None:
    plan = json.loads(good(data.draw(st.sampled_from(PLANS))))
    spoiled = copy.deepcopy(plan)
    # Half of all damage is done to what the plan does.
    first = data.draw(st.sampled_from([*DONE, *sorted(plan)]))
    path = [first, *step_down(data.draw, plan[first])]
    parent: Any = spoiled
    for key in path[:-1]:
        parent = parent[key]
    damage(data.draw, parent, path[-1])
    try:
        result = check_plan(json.dumps(spoiled))
    except InputError:
        return
    if path[0] in DONE and not TOLD & set(path) and result.ok:
        assert substance_of(spoiled) == substance_of(plan), path


@settings(max_examples=80, deadline=None, derandomize=True)
@given(st.data())
def test_damaged_text_is_survived(data: st.DataObject) -> None:
    text = good(data.draw(st.sampled_from(PLANS[1:])))
    at = data.draw(st.integers(0, len(text) - 1))
    until = data.draw(st.integers(at, min(len(text), at + 12)))
    damaged = text[:at] + data.draw(st.text(max_size=4)) + text[until:]
    try:
        check_plan(damaged)
    except InputError:
        return


@settings(max_examples=100, deadline=None, derandomize=True)
@given(st.text(max_size=60))
def test_any_text_is_survived(text: str) -> None:
    try:
        assert not check_plan(text).ok
    except InputError:
        return
