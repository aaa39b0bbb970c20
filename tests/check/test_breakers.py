"""Every rule has a breaker, and the check names exactly what was broken."""

from __future__ import annotations

import json
import random
import sys
from typing import Any

import pytest

import placer
from placer.check.cleanup import follow_moves
from placer.check.rules import NAMES, RULES
from placer.check.verify import check_plan
from placer.program.planned import planned_program
from placer.program.read import read_program
from placer.recipes import catalog
from placer.recipes.circuit import Built
from tests.broken import BREAKERS, FOLLOWS
from tests.broken_cleanup import REWRITE_BREAKERS
from tests.broken_sources import RECIPE_BREAKERS
from tests.check.cleanup_sample import reordered

MIXED = """OPENQASM 2.0;
include "qelib1.inc";
qreg a[3];
qreg b[2];
// @placer.workspace init=zero ends=zero
qreg w[1];
creg c[2];
h a;
ccx a[0],a[1],w[0];
cx w[0],b[0];
t b[0];
ccx a[0],a[1],w[0];
barrier a,b;
ccx a[1],a[2],b[1];
reset a[2];
cu1(pi/4) a[2],b[1];
measure b -> c;
"""

SPLIT = """OPENQASM 3.0;
include "stdgates.inc";
qubit[3] a;
qubit b;
@placer.workspace init=zero ends=zero
qubit[2] w;
bit[3] c;
h a;
ctrl(2) @ x a[0], a[1], w[0];
ctrl(2) @ x w[0], a[2], w[1];
cx w[1], b;
ctrl(2) @ x w[0], a[2], w[1];
ctrl(2) @ x a[0], a[1], w[0];
barrier a;
ctrl(3) @ x a[0], a[1], a[2], b;
c[2] = measure b;
reset b;
ctrl(3) @ z a[0], a[1], a[2], b;
cp(pi/4) a[0], a[2];
c[0] = measure a[0];
"""

CLEANUP = sys.modules[follow_moves.__module__]
CASES = {
    "clean": ("tide-gate", "slate-16"),
    "borrowed": ("full-berths", "tuff-10"),
    "level2": ("deep-channel", "quartzite-20"),
    "misfit": ("night-watch", "shale-12"),
    "holes": ("tide-gate", "breccia-27"),
    "measured": ("tide-gate", "marl-32"),
    "mixed": (MIXED, "slate-16"),
    "split": (SPLIT, "slate-16"),
}
ONLY = {"split": ("clean",)}
# In another order its value would live short enough.
CLEANUP_ORDER: dict[str, Any] = {"misfit": "as-written"}
SEEDS = 2  # per rule and plan; nine plans


@pytest.fixture(scope="session")
def good() -> dict[str, dict[str, Any]]:
    plans = {}
    for name, (program, device) in CASES.items():
        source: Any = program
        if "\n" in program:
            source = read_program(program, f"{name}.qasm")
        only = ONLY.get(name, ())
        order = CLEANUP_ORDER.get(name, "optimised")
        plan = placer.plan(source, device, effort="quick", only=only, cleanup=order)
        plans[name] = json.loads(placer.to_json(plan))
    plans["reordered"] = json.loads(reordered())
    return plans


def test_good_plans_pass(good: dict[str, dict[str, Any]]) -> None:
    for name, data in good.items():
        result = check_plan(json.dumps(data))
        assert result.findings == (), name
        assert result.ok


def test_the_cases_cover_what_breakers_need(good: dict[str, dict[str, Any]]) -> None:
    calls = [call for data in good.values() for call in data["calls"]]
    assert {"clean", "borrowed", "level2"} <= {call["workspace"] for call in calls}
    assert any("measured" in call["recipe"] for call in calls)
    assert any(lease["lender"] for call in calls for lease in call["leases"])
    assert any(data["route"]["swaps"] for data in good.values())
    assert any(not data["verdict"]["fits"] for data in good.values())


@pytest.mark.parametrize("rule", sorted(BREAKERS))
def test_every_breaker_is_named(rule: str, good: dict[str, dict[str, Any]]) -> None:
    spoiled_any = 0
    for name, data in sorted(good.items()):
        for seed in range(SEEDS):
            spoiled = BREAKERS[rule](data, random.Random(f"{rule} {name} {seed}"))
            if spoiled is None:
                continue
            spoiled_any += 1
            result = check_plan(json.dumps(spoiled))
            named = {finding.rule for finding in result.findings}
            assert rule in named, (name, seed, sorted(named))
            assert named <= {rule} | FOLLOWS.get(rule, set()), (name, seed)
            assert not result.ok
    assert spoiled_any > 0


@pytest.mark.parametrize("rule", sorted(RECIPE_BREAKERS))
def test_every_spoiled_recipe_is_named(
    rule: str, good: dict[str, dict[str, Any]]
) -> None:
    spoiled_any = 0
    for name, data in sorted(good.items()):
        for seed in range(4):
            draw = random.Random(f"{rule} {name} {seed}")
            chosen = draw.choice([call["index"] for call in data["calls"]])
            spoiled_any += spoils(rule, data, chosen, draw)
    assert spoiled_any > 3


def spoils(rule: str, data: dict[str, Any], chosen: int, draw: random.Random) -> bool:
    """Spoil the recipe of one call; whether that could be done, and is named."""
    call = next(c for c in data["calls"] if c["index"] == chosen)
    done: list[Built] = []

    def build(name: str, *arguments: Any) -> Built:
        built = catalog.build(name, *arguments)
        if name != call["recipe"] or done:
            return built
        spoiled = RECIPE_BREAKERS[rule](built, draw)
        done.extend([] if spoiled is None else [spoiled])
        return spoiled or built

    result = check_plan(json.dumps(data), build=build)
    named = {finding.rule for finding in result.findings}
    assert (rule in named) == bool(done), (rule, call["recipe"], done)
    assert named <= {rule} | FOLLOWS[rule], (rule, call["recipe"])
    return bool(done)


@pytest.mark.parametrize("rule", sorted(REWRITE_BREAKERS))
def test_every_spoiled_order_is_named(
    rule: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    for seed in range(12):
        draw = random.Random(f"{rule} {seed}")

        def spoiled(*arguments: Any, draw: random.Random = draw) -> Any:
            return REWRITE_BREAKERS[rule](planned_program(*arguments), draw)

        monkeypatch.setattr(CLEANUP, "planned_program", spoiled)
        named = {finding.rule for finding in check_plan(reordered()).findings}
        assert named == {rule}, seed


def test_every_rule_has_one_breaker() -> None:
    broken = [*BREAKERS, *RECIPE_BREAKERS, *REWRITE_BREAKERS]
    assert sorted(NAMES) == sorted(broken)
    assert len(NAMES) == len(broken)
    assert set(FOLLOWS) <= set(NAMES)
    assert set().union(*FOLLOWS.values()) <= set(NAMES)
    assert all(rule.sentence and rule.sentence[0].islower() for rule in RULES)
