"""Plans made by hand pass: two implementations of the same definitions agree."""

from __future__ import annotations

import json
import random

import pytest

from placer.check.verify import check_plan
from tests.broken import BREAKERS
from tests.check.handmade import make
from tests.check.samples import GRID, LINE, SAMPLES, sample


@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_a_plan_by_hand_passes(name: str) -> None:
    result = check_plan(sample(name))
    assert result.findings == ()
    assert result.notes == ()


def test_the_samples_hold_what_they_are_for() -> None:
    plans = {name: json.loads(sample(name)) for name in SAMPLES}
    figures = {name: plan["figures"] for name, plan in plans.items()}
    lenders = [
        lease["lender"]
        for plan in plans.values()
        for call in plan["calls"]
        for lease in call["leases"]
        if lease["kind"] == "borrowed"
    ]
    assert any(lenders)
    assert figures["measured"]["measurements"] == 3
    assert figures["level2"]["level2_gates"] > 0
    assert figures["level2"]["worst_value"].endswith("in level 2")
    assert figures["scope"]["worst_value"].startswith("both_1.v")
    assert figures["plain"]["costs"]["preparation"] > 0
    assert all(one["swaps"] > 0 for one in figures.values())
    assert any(one["costs"]["swaps"] > 0 for one in figures.values())


@pytest.mark.parametrize("seed", range(6))
def test_shuffled_sites_pass_as_well(seed: int) -> None:
    draw = random.Random(seed)
    for name in ("clean", "measured", "plain", "scope"):
        program, _, path, recipes = SAMPLES[name]
        wires = len(json.loads(sample(name))["wires"])
        where = draw.sample(range(8), wires)
        device = draw.choice([LINE, GRID])
        text = make(program, device, name=path, recipes=recipes, sites=where)
        assert check_plan(text).findings == (), (name, where)


@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_breakers_are_named_on_plans_by_hand(name: str) -> None:
    good = json.loads(sample(name))
    for rule, breaker in sorted(BREAKERS.items()):
        spoiled = breaker(good, random.Random(f"{rule} {name}"))
        if spoiled is None:
            continue
        named = {finding.rule for finding in check_plan(json.dumps(spoiled)).findings}
        assert rule in named, (rule, sorted(named))
