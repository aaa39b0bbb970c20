"""Verdicts: every limit is compared, the sentence names what is missed."""

from __future__ import annotations

import dataclasses

import pytest

from placer.device.model import Budget
from placer.plan import Costs, Figures
from placer.planner.verdict import limits_of, nearest_change, overrun, verdict_of

GOOD = Figures(
    sites=6,
    swaps=3,
    time_ns=4_000,
    two_qubit_gates=20,
    one_qubit_gates=30,
    t_gates=7,
    measurements=0,
    level2_gates=0,
    costs=Costs(two_qubit=10**11),
    success=0.9,
    worst_share=0.3,
    worst_value="w[0]",
)


def test_a_plan_within_every_limit_fits() -> None:
    budget = Budget(share=0.5, least_success=0.8, most_sites=6, longest_ns=4_000)
    assert overrun(GOOD, budget) == 0
    verdict = verdict_of(GOOD, budget)
    assert verdict.fits
    assert all(limit.holds for limit in verdict.limits)
    assert "w[0]" in verdict.sentence


@pytest.mark.parametrize(
    ("budget", "word", "change"),
    [
        (Budget(share=0.2), "w[0] lives 30%", "--budget 0.3"),
        (Budget(least_success=0.95), "0.95 needed", "--least-success 0.9"),
        (Budget(most_sites=5), "uses 6 sites", "--most-sites 6"),
        (Budget(longest_ns=3_000), "runs 4 us", "4 us"),
    ],
)
def test_each_limit_can_be_missed_alone(budget: Budget, word: str, change: str) -> None:
    verdict = verdict_of(GOOD, budget)
    assert not verdict.fits
    assert word in verdict.sentence
    assert [limit.holds for limit in limits_of(GOOD, budget)].count(False) == 1
    assert overrun(GOOD, budget) > 0
    assert change in nearest_change([GOOD], budget)


def test_the_nearest_change_is_the_smallest_of_those_seen() -> None:
    worse = dataclasses.replace(GOOD, worst_share=0.9)
    text = nearest_change([worse, GOOD], Budget(share=0.2))
    assert "0.3" in text
    both = dataclasses.replace(GOOD, worst_share=0.9, sites=20)
    none = nearest_change([both], Budget(share=0.2, most_sites=5))
    assert "no single limit" in none
