"""One tiny plan and one edit per rule, with the value that the check must find."""

from __future__ import annotations

import dataclasses
import json
import math
import sys
from collections.abc import Callable
from typing import Any

import pytest

from placer.check.cleanup import follow_moves
from placer.check.rules import NAMES
from placer.check.verify import check_plan
from placer.device.read import read_device
from placer.program.model import Program
from placer.program.planned import planned_program
from placer.program.read import read_program
from placer.recipes import catalog
from placer.recipes.circuit import Built, Op
from placer.units import cost_of_error
from tests.check.cleanup_sample import reordered
from tests.check.handmade import make
from tests.check.samples import ABLE, CALLS, FULL, GRID, HEAD, SCOPE, SITES, device

Data = dict[str, Any]
CLEANUP = sys.modules[follow_moves.__module__]

# Two wires at the ends of three sites.  h takes 30 ns; the cx is one link away: it is
# planned with 50 ns + 1 * ceil(3 * 50 / 4) = 88 ns.  The route swaps (0, 1) first.
TINY = make(
    f"{HEAD}qubit[2] q;\nh q[0];\ncx q[0], q[1];\n",
    device("{kind: line, sites: 3}"),
    name="tiny.qasm",
    sites=[0, 2],
)
# Only the middle site offers level 2; the chain lifts a[1], three level-2 gates.
HIGH = make(
    f"{HEAD}qubit[3] a;\nctrl(2) @ x a[0], a[1], a[2];\n",
    device(
        "{kind: line, sites: 3}",
        sites=SITES + "  level2: {t1_us: 40, error: 3e-3, time_ns: 35}\n",
        able=ABLE + "  level2_sites: [1]\n",
    ).replace("time_ns: 50}", "time_ns: 50, level2: {error: 9e-3, time_ns: 120}}"),
    name="high.qasm",
    recipes=("level2-chain",),
)
# Calls 4 (four controls, slots on sites 5 and 6) and 6 (three controls, slot on 5).
CLEAN = make(CALLS, GRID, name="calls.qasm", recipes=("clean-ladder",))
# Call 0 borrows site 3 of a[3], which has an h (step 1) afterwards.
KEPT = FULL.replace("qubit[4] a;", "// a note\nqubit[4] a;")
LENT = make(KEPT, GRID, name="full.qasm", recipes=("borrowed-v-chain",))
# Steps 0 to 2 are h; step 3 computes into v[0] on site 5.
HELD = make(SCOPE, GRID, name="scope.yaml", recipes=("and-mirror",))


def test_the_tiny_plan_is_what_hands_make_of_it() -> None:
    plan = json.loads(TINY)
    assert plan["others"] == [[0, 0, 30], [1, 30, 118]]
    assert plan["route"]["swaps"] == [[0, 1]]
    assert plan["route"]["gaps"] == [[], [[0, 0]]]
    figures = plan["figures"]
    # h until 30, swap until 30 + 3 * 50 = 180, cx until 230.
    assert figures["time_ns"] == 230
    assert figures["sites"] == 3
    one, two = cost_of_error(3e-4), cost_of_error(6e-3)
    # -ln(1 - 6e-3) = 6.018072...e-3, by series: 6e-3 + 1.8e-5 + 7.2e-8 + 3.2e-10.
    assert two == pytest.approx(6.018072325e9, abs=2000)
    assert figures["costs"]["one_qubit"] == one
    assert figures["costs"]["two_qubit"] == two
    assert figures["costs"]["swaps"] == 3 * two
    # Only q[1] waits: 180 ns on site 2, T1 = 80 us, T2 = 60 us.
    kept = (1 + math.exp(-0.18 / 80) + 2 * math.exp(-0.18 / 60)) / 4
    assert figures["costs"]["decay"] == pytest.approx(-math.log(kept) * 1e12, abs=2)
    # (1/80 + 2/60) / 4 per us; both wires start unknown and stay until 118 ns.
    rate = math.ceil((1 / 80 + 2 / 60) / 4 * 1e9)
    estimate = one + (math.ceil(3 * two / 4) + two) + 2 * 118 * rate
    assert plan["bound"]["estimate"] == estimate
    assert check_plan(TINY).findings == ()


@pytest.mark.parametrize("text", [TINY, HIGH, CLEAN, LENT, HELD])
def test_the_plans_pass(text: str) -> None:
    assert check_plan(text).findings == ()


def call(data: Data, index: int) -> Data:
    return next(c for c in data["calls"] if c["index"] == index)


def put(*path: Any) -> Callable[[Data], None]:
    """Return an edit: all but the last are keys, the last is the new value."""

    def edit(data: Data) -> None:
        place: Any = data
        for key in path[:-2]:
            place = place[key]
        place[path[-2]] = path[-1]

    return edit


def other_device(old: str, new: str) -> Callable[[Data], None]:
    def edit(data: Data) -> None:
        assert old in data["device"]["text"]
        text = data["device"]["text"].replace(old, new)
        data["device"]["text"] = text
        data["device"]["hash"] = read_device(text, "handmade.yaml").hash

    return edit


def kept_back(data: Data) -> None:
    text = data["program"]["text"].replace("// a note", "@placer.keep")
    data["program"]["text"] = text
    data["program"]["hash"] = read_program(text, "full.qasm").hash


def moved(index: int, to: int) -> Callable[[Data], None]:
    def edit(data: Data) -> None:
        step = call(data, index)
        for one in (step, *step["leases"]):
            one["start"], one["end"] = to, to + one["end"] - one["start"]

    return edit


def called(index: int, *path: Any) -> Callable[[Data], None]:
    return lambda data: put(*path)(call(data, index))


def doubled_share(data: Data) -> None:
    data["figures"]["worst_share"] *= 2


def late_h(data: Data) -> None:
    data["others"] = [[0, 200, 230], [1, 30, 118]]


EARLY_SWAP = {"gaps": [[], [[0, 2]]], "swaps": [[0, 1]]}
MID_SWAP = {"gaps": [[[0, 0]], [[1, 2]]], "swaps": [[0, 1]]}
ROUTE = {"held_out": 0, "expected_swaps": -1.0}

# u0 u1 u2 c0 c1 d0 c2 u3 d2 u4 c0 u5 d0 c2 u6 u2 c0 u1 u0 u7: the order of the sample;
# use 3 reads v[2], use 5 v[0]; use 7 is the h on a[2], which v[1] is computed from.
ORDER = reordered()


def move(place: int, *new: object) -> Callable[[Data], object]:
    def edit(data: Data) -> None:
        data["cleanup"]["moves"][place : place + 1] = [list(one) for one in new]

    return edit


EDITS: dict[str, tuple[str, Callable[[Data], object], str]] = {
    "cleanup-unreadable": (ORDER, move(2, ("use", 4)), "use 4 comes where use 2"),
    "value-read-dead": (
        ORDER,
        move(4),
        "'compute' of 's_1.v[2]' (line 13) reads 's_1.v[1]' (line 12), which is not",
    ),
    "cleanup-input-changed": (
        ORDER,
        lambda d: d["cleanup"]["moves"].append(d["cleanup"]["moves"].pop(17)),
        "'uncompute' of 's_1.v[1]' (line 12) comes after line 19, which changes what",
    ),
    "record-open": (
        ORDER,
        move(18, ("drop", 0)),
        "measured by move 18 and never fixed",
    ),
    "value-left": (ORDER, move(18), "'s_1.v[0]' (line 11) is never cleaned up"),
    "cleanup-misstated": (
        ORDER,
        lambda d: d["cleanup"]["values"][0].update(computed=9),
        "computed 9 and dropped 2 times, the moves say (3, 2)",
    ),
    "plan-malformed": (TINY, put("budget", "share", None), "None is not"),
    "source-changed": (TINY, put("device", "hash", "00"), "'00' is stated"),
    "header-misstated": (TINY, put("calibrated", "2026-01-06"), "2026-01-05"),
    "step-missing": (TINY, lambda d: d["others"].pop(0), "planned 0 times"),
    "step-misstated": (CLEAN, called(4, "line", 7), "7 is stated, the program says 6"),
    "wire-missing": (TINY, lambda d: d["wires"].pop("q[1]"), "it has no site"),
    "site-unknown": (TINY, put("wires", "q[1]", 3), "no site 3, the device has 3"),
    "site-out-of-service": (
        CLEAN,
        other_device("capabilities:", "out_of_order: [6]\ncapabilities:"),
        "site 6 is out of order",
    ),
    "recipe-unknown": (CLEAN, called(4, "recipe", "toffoli"), "'toffoli' is no recipe"),
    "workspace-misstated": (CLEAN, called(4, "workspace", "none"), "uses 'clean'"),
    "lease-wrong": (CLEAN, called(6, "leases", 0, "end", 9), "clean-ladder"),
    "lost-misstated": (CLEAN, called(4, "lost", []), "none-gray"),
    "recipe-excluded": (CLEAN, put("only", ["none"]), "uses clean, allowed: none"),
    # The clean ladder needs nothing; the measured one would: see the other plan.
    "capability-missing": (
        make(CALLS, GRID, name="calls.qasm", recipes=("clean-measured",)),
        other_device("conditional_latency_ns: 400", "conditional_latency_ns: none"),
        "needs conditional gates",
    ),
    # a[1] must be on the middle site, and changes places with a[0].
    "level2-missing": (
        HIGH,
        put("wires", {"a[0]": 1, "a[1]": 0, "a[2]": 2}),
        "needs level 2 on site 0",
    ),
    # Sites 0 and 1 of a[2] and a[3] are all that level 2 is left on: no link of a[1]
    # and a[2], which both need it, fits any more.
    "link-out-of-reach": (
        make(
            f"{HEAD}qubit[4] a;\nctrl(3) @ x a[0], a[1], a[2], a[3];\n",
            device(
                "{kind: line, sites: 4}",
                sites=SITES + "  level2: {t1_us: 40, error: 3e-3, time_ns: 35}\n",
                able=ABLE + "  level2_sites: [0, 1, 2]\n",
            ).replace(
                "time_ns: 50}", "time_ns: 50, level2: {error: 9e-3, time_ns: 9}}"
            ),
            name="chain.qasm",
            recipes=("level2-chain",),
        ),
        other_device("level2_sites: [0, 1, 2]", "level2_sites: [0, 2]"),
        "sites 1 and 2 reach no fitting link",
    ),
    "order-broken": (TINY, put("others", 1, [1, 29, 117]), "q[0] ends at 30"),
    "duration-misstated": (TINY, put("others", 1, [1, 30, 119]), "it takes 88 ns"),
    "two-things-one-site": (
        TINY,
        put("wires", "q[1]", 0),
        "wire q[0] and by wire q[1]",
    ),
    "lender-busy": (LENT, put("others", 0, [1, 0, 30]), "a[3] is lent over [0, "),
    "lender-unlendable": (LENT, kept_back, "a[3] must not be lent"),
    "lender-misstated": (
        LENT,
        called(0, "leases", 0, "lender", "b[0]"),
        "lender b[0], but site 3 is held by a[3]",
    ),
    "estimate-misstated": (TINY, put("bound", "estimate", 1), "1 is stated"),
    "function-differs": (TINY, late_h, "gets other values of q[0] on site 0"),
    "slot-not-clean": (CLEAN, called(4, "leases", 0, "site", 0), "site 0 is leased"),
    # The value is computed again after its cleanup, and stays.
    "workspace-not-returned": (HELD, moved(3, 10**6), "is not in |0>"),
    "route-incomplete": (
        TINY,
        put("route", {**ROUTE, "gaps": [[], []], "swaps": [[0, 1]]}),
        "1 of 1 two-body gates are not done",
    ),
    "route-off-link": (
        TINY,
        put("route", "swaps", [[0, 2]]),
        "no usable link of 0 and 2",
    ),
    # a[1] is brought to site 0, which has no level 2, before it is lifted ...
    "level2-off-link": (
        HIGH,
        put("route", {**ROUTE, **EARLY_SWAP}),
        "offer no such level-2 gate",
    ),
    # ... and while it is up.
    "swap-while-level2": (
        HIGH,
        put("route", {**ROUTE, **MID_SWAP}),
        "0 and 1 are exchanged while one holds level 2",
    ),
    "figures-misstated": (TINY, put("figures", "time_ns", 231), "the route gives 230"),
    "share-misstated": (CLEAN, doubled_share, "slot 0 of 'mcz' at line 8"),
    "success-misstated": (TINY, put("figures", "success", 0.5), "0.5 is stated"),
    "bound-above-estimate": (TINY, put("bound", "least", 10**12), "1000000000000"),
    "floor-above-cost": (TINY, put("bound", "floor", 10**12), "1000000000000"),
    "proof-misstated": (TINY, put("bound", "proven", True), "proven: True"),
    "policy-misstated": (
        TINY,
        put("policies", 0, "possible", True),
        "exactly if it is possible",
    ),
    "limit-misstated": (
        TINY,
        put("verdict", "limits", 3, "value", 229),
        "'run time', 230",
    ),
    "verdict-misstated": (
        TINY,
        put("verdict", "fits", False),
        "the limits say 'fits:'",
    ),
}


@pytest.mark.parametrize("rule", sorted(EDITS))
def test_an_edit_is_told_with_its_value(rule: str) -> None:
    text, edit, words = EDITS[rule]
    data = json.loads(text)
    edit(data)
    told = [f.what for f in check_plan(json.dumps(data)).findings if f.rule == rule]
    assert any(words in what for what in told), told


def flipped(wire_of: Callable[[Built], int]) -> Callable[..., Built]:
    """Return a way to build recipes that flips one wire at the end."""

    def build(*arguments: Any) -> Built:
        built = catalog.build(*arguments)
        flip = Op("x", (wire_of(built),))
        coarse = dataclasses.replace(built.coarse, ops=(*built.coarse.ops, flip))
        fine = dataclasses.replace(built.fine, ops=(*built.fine.ops, flip))
        return dataclasses.replace(built, coarse=coarse, fine=fine)

    return build


SPOILED: dict[str, tuple[str, Callable[[Built], int], str]] = {
    "recipe-wrong": (CLEAN, lambda built: built.controls, "its coarse circuit"),
    "slot-not-returned": (
        CLEAN,
        lambda built: built.controls + 1,
        "site 5 is not back in |0>",
    ),
    "borrowed-changed": (
        LENT,
        lambda built: built.controls + 1,
        "site 3 does not come back as it was",
    ),
}


@pytest.mark.parametrize("rule", sorted(SPOILED))
def test_a_wrong_recipe_is_told(rule: str) -> None:
    text, wire_of, words = SPOILED[rule]
    found = check_plan(text, build=flipped(wire_of)).findings
    told = [f.what for f in found if f.rule == rule]
    assert any(words in what for what in told), told


def test_a_fix_that_is_forgotten_leaves_a_phase(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    def without_fix(*arguments: Any) -> Program:
        program = planned_program(*arguments)
        fix = next(op for op in program.operations if op.condition and op.name == "z")
        kept = [op for op in program.operations if op is not fix]
        return dataclasses.replace(
            program,
            operations=tuple(
                dataclasses.replace(op, index=n) for n, op in enumerate(kept)
            ),
        )

    monkeypatch.setattr(CLEANUP, "planned_program", without_fix)
    told = [(f.rule, f.what) for f in check_plan(ORDER).findings]
    text = "the records leave a phase that depends on a value"
    assert told == [("cleanup-differs", text)]


def test_every_rule_has_one_hand_made_test() -> None:
    others = ["cleanup-differs"]
    assert sorted(NAMES) == sorted([*EDITS, *SPOILED, *others])
