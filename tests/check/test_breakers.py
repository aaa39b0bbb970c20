"""Every rule has a breaker, and the check names exactly what was broken."""

from __future__ import annotations

import json
import random
from typing import Any

import pytest

import placer
from placer.check import case as case_room
from placer.check.rules import RULES
from placer.check.verify import check_plan
from placer.program.read import read_program
from placer.recipes.circuit import Built
from tests.broken import BREAKERS, SPOILED_RECIPES

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

CASES = {
    "clean": ("tide-gate", "slate-16"),
    "borrowed": ("full-berths", "tuff-10"),
    "level2": ("deep-channel", "quartzite-20"),
    "misfit": ("night-watch", "shale-12"),
    "holes": ("tide-gate", "breccia-27"),
    "measured": ("tide-gate", "marl-32"),
    "mixed": ("", "slate-16"),
}
ALSO = {
    # A change that breaks one rule may make others visible; it must not hide it.
    "any": set(RULES),
}


@pytest.fixture(scope="session")
def good() -> dict[str, dict[str, Any]]:
    plans = {}
    for name, (program, device) in CASES.items():
        source: Any = program or read_program(MIXED, "mixed.qasm")
        plan = placer.plan(source, device, effort="quick")
        plans[name] = json.loads(placer.to_json(plan))
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
        for seed in range(3):
            spoiled = BREAKERS[rule](data, random.Random(f"{rule} {name} {seed}"))
            if spoiled is None:
                continue
            spoiled_any += 1
            result = check_plan(json.dumps(spoiled))
            named = {finding.rule for finding in result.findings}
            assert rule in named, (name, seed, sorted(named))
            assert not result.ok
    assert spoiled_any > 0


@pytest.mark.parametrize("rule", sorted(SPOILED_RECIPES))
def test_spoiled_recipes_are_named(
    rule: str,
    good: dict[str, dict[str, Any]],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    kind, spoil = SPOILED_RECIPES[rule]
    true_build = case_room.catalog.build

    def build(*arguments: Any) -> Built:
        built = true_build(*arguments)
        return spoil(built) if not kind or kind in built.slots else built

    monkeypatch.setattr(case_room.catalog, "build", build)
    named: set[str] = set()
    for data in good.values():
        named |= {f.rule for f in check_plan(json.dumps(data)).findings}
    assert rule in named


def test_every_rule_has_one_breaker() -> None:
    assert sorted(RULES) == sorted({*BREAKERS, *SPOILED_RECIPES})
    assert not set(BREAKERS) & set(SPOILED_RECIPES)
    assert all(sentence and sentence[0].islower() for sentence in RULES.values())
