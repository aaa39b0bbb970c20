"""Tiny plans whose schedule, waits, lives and costs are worked out in the comments."""

from __future__ import annotations

import json
import math
from typing import Any

import pytest

from placer.check.case import Case, open_case
from placer.check.follow import Follower, Walk
from placer.check.verify import check_plan
from tests.check.handmade import make
from tests.check.samples import HEAD

# One set of round numbers for all cases.  Costs in 1e-12 of -ln(1 - error), up:
#   -ln(0.999) = 0.001 000 500 333 583 5      -> ONE
#   -ln(0.99)  = 0.010 050 335 853 501 4      -> TWO
#   -ln(0.98)  = 0.020 202 707 317 519 5      -> READ
#   -ln(0.995) = 0.005 012 541 823 544 3      -> PREP
# Slope of decay: (1/100 + 2/50) / 4 = 0.0125 per us = 12 500 000 per ns.
ONE, TWO, READ, PREP = 1000500334, 10050335854, 20202707318, 5012541824
RATE = 12_500_000
DEVICE = """\
name: gabbro
note: invented, round numbers
calibrated: 2026-01-05
lattice: {%s}
sites:
  t1_us: 100
  t2_us: 50
  gate_error: 1e-3
  gate_time_ns: 10
  readout_error: 2e-2
  readout_time_ns: 1000
  reset_error: 2e-2
  reset_time_ns: 1500
  prep_error: 5e-3
%slinks: {error: 1e-2, time_ns: 100%s}
capabilities:
  mid_circuit_measurement: true
  conditional_latency_ns: 200
  reset: true
%s"""
LEVEL2 = (
    "  level2: {t1_us: 40, error: 3e-3, time_ns: 35}\n",
    ", level2: {error: 2e-2, time_ns: 120}",
    "  level2_sites: all\n",
)


def plain(lattice: str, *, more: str = "") -> str:
    return DEVICE % (lattice, "", "", more)


def waits(*spans_ns: int) -> int:
    """Charge waits one by one, each rounded up: T1 = 100 us, T2 = 50 us."""
    kept = [
        (1 + math.exp(-ns / 100_000) + 2 * math.exp(-ns / 50_000)) / 4
        for ns in spans_ns
    ]
    return sum(math.ceil(-math.log(one) * 1e12) for one in kept)


def opened(text: str) -> tuple[dict[str, Any], Case, Walk]:
    data = json.loads(text)
    case = open_case(json.loads(text))
    assert isinstance(case, Case)
    walk = Follower(case).follow()
    assert not walk.is_broken
    assert case.findings == []
    return data, case, walk


def planned(case: Case) -> list[tuple[int, int]]:
    return [(step.start, step.end) for step in case.steps]


def says_estimate(text: str, estimate: int) -> bool:
    """Whether the check agrees with this placement cost, and with no other."""
    data = json.loads(text)
    data["bound"] |= {"estimate": estimate, "least": None, "gap": None}
    data["bound"] |= {"proven": False, "floor": 0}
    right = not any(
        f.rule == "estimate-misstated" for f in check_plan(json.dumps(data)).findings
    )
    data["bound"]["estimate"] += 1
    wrong = not any(
        f.rule == "estimate-misstated" for f in check_plan(json.dumps(data)).findings
    )
    return right and not wrong


def test_one_gate_on_two_sites() -> None:
    source = f"{HEAD}qubit[2] q;\nh q[0];\ncx q[0], q[1];\n"
    text = make(source, plain("kind: line, sites: 2"), name="two.qasm")
    _, case, walk = opened(text)
    # h [0, 10), cx [10, 110).
    assert planned(case) == [(0, 10), (10, 110)]
    assert walk.last == 110
    assert walk.counts == {"one_qubit_gates": 1, "two_qubit_gates": 1}
    # q[1] waits 10 ns.  With x = 1e-4: F = (1 + e^-x + 2 e^-2x) / 4
    #   = 1 - 1.25 x + 1.125 x^2 - (17/24) x^3 = 1 - y,  y = 1.249 887 507 1e-4;
    # -ln F = y + y^2/2 + y^3/3 = 1.249 887 507e-4 + 7.810 939e-9 + 6.5e-13.
    assert walk.costs["decay"] == 124_996_563 == waits(10)
    assert walk.costs["one_qubit"] == ONE
    assert walk.costs["two_qubit"] == TWO
    assert walk.costs["swaps"] == walk.costs["preparation"] == 0
    assert says_estimate(text, ONE + TWO + 2 * 110 * RATE)
    assert walk.shares == {}


def test_one_swap_on_a_slow_link() -> None:
    source = f"{HEAD}qubit[2] q;\ncx q[0], q[1];\n"
    slow = "link_overrides:\n  0-1: {time_ns: 70}\n"
    device = plain("kind: line, sites: 3", more=slow)
    text = make(source, device, name="far.qasm", sites=[0, 2])
    data, case, walk = opened(text)
    # Nominal: lower median of 70 and 100 = 70; the cx is one link away:
    # 70 + ceil(3 * 70 / 4) = 70 + 53.
    assert planned(case) == [(0, 123)]
    # Real: swap over 0-1 takes 3 * 70, the cx over 1-2 takes 100.
    assert data["route"]["swaps"] == [[0, 1]]
    assert walk.last == 310
    # q[1] waits on site 2 while q[0] travels; what was on site 1 is nobody's.
    assert walk.costs["decay"] == waits(210)
    assert walk.costs["swaps"] == 3 * TWO
    assert walk.costs["two_qubit"] == TWO
    assert walk.touched == {0, 1, 2}
    assert says_estimate(text, math.ceil(3 * TWO / 4) + TWO + 2 * 123 * RATE)


def test_one_clean_slot() -> None:
    source = f"{HEAD}qubit[4] q;\nctrl(3) @ x q[0], q[1], q[2], q[3];\n"
    device = plain("kind: all-to-all, sites: 5")
    text = make(source, device, name="clean.qasm", recipes=("clean-ladder",))
    _, case, walk = opened(text)
    # Slot s = 4.  Compute: h 10, t 20, cx(1,s) 120, tdg 130, cx(0,s) 230, t 240,
    # cx(1,s) 340, tdg 350, h 360.  Use: h(3) 10, cx(2,3) 110, tdg(3) 120,
    # cx(s,3) 460, t(3) 470, cx(2,3) 570, tdg(3) 580 and t(2) 580, cx(s,3) 680,
    # t(3) 690, h(3) 700, cx(s,2) 780, t(s) and tdg(2) 790, cx(s,2) 890.
    # Take back: h 900, t 910, cx(1,s) 1010, tdg 1020, cx(0,s) 1120, t 1130,
    # cx(1,s) 1230, tdg 1240, h 1250.
    assert planned(case) == [(0, 1250)]
    assert walk.last == 1250
    assert walk.counts == {
        "one_qubit_gates": 21,
        "two_qubit_gates": 12,
        "t_gates": 15,
    }
    assert walk.costs["decay"] == waits(
        *(130, 790, 130),  # q[0]: [0, 130), [230, 1020), [1120, 1250)
        *(20, 120, 570, 120, 20),  # q[1]: [0, 20) ... [1010, 1130), [1230, 1250)
        *(10, 360, 100, 360),  # q[2]: [0, 10), [110, 470), [580, 680), [890, 1250)
        *(240, 550),  # q[3]: [120, 360), [700, 1250)
        120,  # the slot: [460, 580); before and after it nothing lives there
    )
    assert walk.costs["preparation"] == PREP
    # 1250 ns of min(T1, T2) = 50 us; nothing else is a value.
    assert list(walk.shares.values()) == [pytest.approx(0.025, rel=1e-12)]
    assert walk.names[next(iter(walk.shares))] == "slot 0 of 'mcx' at line 4"
    assert says_estimate(text, 12 * TWO + 21 * ONE + PREP + 5 * 1250 * RATE)


def test_one_call_through_level_2() -> None:
    source = f"{HEAD}qubit[3] q;\nctrl(2) @ x q[0], q[1], q[2];\n"
    device = DEVICE % ("kind: line, sites: 4", *LEVEL2)
    options: dict[str, Any] = {"recipes": ("level2-chain",), "sites": [0, 1, 3]}
    text = make(source, device, name="high.qasm", **options)
    data, case, walk = opened(text)
    # Three level-2 gates of 120 ns in a row, the middle one a link away:
    # 360 + ceil(3 * 100 / 4).
    assert planned(case) == [(0, 435)]
    # q[2] comes nearer: the swap over 2-3 takes [0, 300), beside the gate that lifts
    # q[1], [0, 120).
    data["route"] |= {"swaps": [[2, 3]], "gaps": [[[0, 0]], [[1, 2]]]}
    _, case, walk = opened(json.dumps(data))
    # Gate 1 on (1, 2) takes [300, 420), gate 2 on (0, 1) takes [420, 540).
    assert walk.last == 540
    assert walk.counts == {"level2_gates": 3}
    assert walk.costs["level2"] == 3 * READ  # the same 2e-2 as a measurement
    assert walk.costs["swaps"] == 3 * TWO
    # q[1] waits in level 2 over [120, 300): populations decay with G1 = 1/100 and
    # G2 = 1/40, coherences with half the rates of both their levels and with
    # 1/Tphi = 1/50 - 1/200 = 0.015 times the squared distance of the levels.
    time, g1, g2, phi = 0.18, 0.01, 0.025, 0.015
    kept = 1 + math.exp(-time * g1) + math.exp(-time * g2)
    kept += 2 * math.exp(-time * (g1 / 2 + phi))
    kept += 2 * math.exp(-time * ((g1 + g2) / 2 + phi))
    kept += 2 * math.exp(-time * (g2 / 2 + 4 * phi))
    high = math.ceil(-math.log(kept / 9) * 1e12)
    # To first order (3 * 0.035 + 12 * 0.015) / 9 * 0.18 = 0.0057, from above.
    assert 0.99 * 5.7e9 < high < 5.7e9
    # q[0] waits over [120, 420), q[2] over [420, 540).
    assert walk.costs["decay"] == pytest.approx(waits(300, 120) + high, abs=1)
    # From 0 to 540 of 40 us; wire 1 is the one.
    assert walk.stays == {1: pytest.approx(0.54 / 40, rel=1e-12)}
    assert walk.shares == {}
    # Planned: q[1] is in level 2 for 360 ns, which cost (3 * 0.035 + 12 * 0.015) / 9
    # = 0.031 666 67 per us, rounded up, instead of 0.0125.
    more = 31_666_667 - RATE
    moved = math.ceil(3 * TWO / 4)
    estimate = 3 * READ + moved + 3 * 435 * RATE + 360 * more
    assert says_estimate(text, estimate)


def test_one_cleanup_by_measurement() -> None:
    source = (
        "registers:\n  a: {width: 2}\n  b:\n"
        "steps:\n  - scope:\n      name: once\n      workspace: {v: 1}\n"
        "      compute:\n        - and: {controls: [a.0, a.1], into: v.0}\n"
        "      body:\n        - cx: v.0, b\n"
    )
    device = plain("kind: all-to-all, sites: 4")
    text = make(source, device, name="once.yaml", recipes=("and-measured",))
    data, case, walk = opened(text)
    assert sorted(data["wires"]) == ["a[0]", "a[1]", "b", "once_1.v[0]"]
    # Compute: h 10, t 20, cx(a1,v) 120, tdg 130, cx(a0,v) 230, t 240, cx(a1,v) 340,
    # tdg 350, h 360, sdg 370.  Use: cx(v,b) 470.  Clean up: h 480, measure 1480,
    # answer at 1680; then cz(a0,a1) 1780 and x(v) 1690, both in full.
    assert planned(case) == [(0, 370), (370, 470), (470, 1780)]
    assert walk.last == 1780
    assert walk.counts == {
        "one_qubit_gates": 9,
        "two_qubit_gates": 5,
        "t_gates": 4,
        "measurements": 1,
    }
    assert walk.costs["measurement"] == READ
    assert walk.costs["preparation"] == PREP
    assert walk.costs["decay"] == waits(
        *(130, 1450),  # a[0]: until 130, [230, 1680)
        *(20, 120, 1340),  # a[1]: until 20, [120, 240), [340, 1680)
        200,  # v, for the answer: [1480, 1680)
        *(370, 1310),  # b: until 370, [470, 1780)
    )
    # v lives from its h to its x.
    assert list(walk.shares.values()) == [pytest.approx(1690 / 50_000, rel=1e-12)]
    estimate = 5 * TWO + 9 * ONE + READ + PREP + 4 * 1780 * RATE
    assert says_estimate(text, estimate)
