"""Spoil a good plan in exactly one way, one breaker per rule of the check.

A breaker takes the parsed JSON of a good plan and a random generator, and returns a
spoiled copy, or `None` if this plan offers no chance.  `FOLLOWS` says which further
rules may be named with a breaker's own: what is moved costs and takes something else.
"""

from __future__ import annotations

import copy
import hashlib
import json
import random
from collections.abc import Callable
from typing import Any

from placer.check.verify import check_plan
from placer.device.read import read_device
from placer.program.read import read_program
from tests import broken_sources
from tests.broken_cleanup import CLEANUP_BREAKERS, CLEANUP_FOLLOWS
from tests.broken_sources import (
    Data,
    calls_with,
    kept_wires,
    lent_leases,
    operands_of,
    unknown_wires,
)

Breaker = Callable[[Data, "random.Random"], Data | None]
COUNTED = (
    "cost",
    "level2_gates",
    "measurements",
    "one_qubit_gates",
    "sites",
    "swaps",
    "t_gates",
    "time_ns",
    "two_qubit_gates",
)


def malformed(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    parent, key = draw.choice(
        [
            *((spoiled, key) for key in sorted(spoiled) if key != "format"),
            *((spoiled["figures"], key) for key in sorted(spoiled["figures"])),
            *((call, key) for call in spoiled["calls"] for key in sorted(call)),
        ]
    )
    if draw.random() < 0.5:
        del parent[key]
    else:
        # No field of a plan takes a list in a list of texts.
        parent[key] = draw.choice([[["nonsense"]], float("inf"), {"odd": 1}])
    return spoiled


def source_changed(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    source = spoiled[draw.choice(["program", "device"])]
    key = draw.choice(["hash", "name", "text"])
    if key == "hash":
        source["hash"] = hashlib.sha256(draw.randbytes(4)).hexdigest()
    elif key == "text":
        is_yaml = source["syntax"] == "yaml"
        source["text"] += f"{'#' if is_yaml else '//'} {draw.random()}\n"
    else:
        source["name"] += "x"
    return spoiled


def wire_missing(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    name = draw.choice(sorted(spoiled["wires"]))
    site = spoiled["wires"].pop(name)
    if draw.random() < 0.5:
        spoiled["wires"]["no_such_wire"] = site
    return spoiled


def site_unknown(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    leases = [lease for call in spoiled["calls"] for lease in call["leases"]]
    site = draw.randint(2000, 5000)
    if leases and draw.random() < 0.5:
        draw.choice(leases)["site"] = site
    else:
        spoiled["wires"][draw.choice(sorted(spoiled["wires"]))] = site
    return spoiled


def step_missing(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    rows = spoiled[draw.choice(["calls", "others"])]
    if not rows:
        return None
    at = draw.randrange(len(rows))
    if draw.random() < 0.5:
        rows.pop(at)
    else:
        rows.append(copy.deepcopy(rows[at]))
    return spoiled


def recipe_unknown(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    # One exists for every call, or for other kinds and sizes only.
    name = draw.choice(["no-such-recipe", "", "swap"])
    draw.choice(spoiled["calls"])["recipe"] = name
    return spoiled


def recipe_excluded(data: Data, draw: random.Random) -> Data | None:
    # Two controls without a slot leave nothing to choose, and are always allowed.
    plain = ("toffoli", "and-mirror", "and-measured")
    used = {c["workspace"] for c in data["calls"] if c["recipe"] not in plain}
    others = sorted({"clean", "borrowed", "level2", "none"} - used)
    if not used or data["only"]:
        return None
    spoiled = copy.deepcopy(data)
    spoiled["only"] = [draw.choice(others)]
    return spoiled


def lease_wrong(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    leased = [call for call in spoiled["calls"] if call["leases"]]
    if not leased:
        return None
    call = draw.choice(leased)
    lease = draw.choice(call["leases"])
    kind = draw.randrange(5)
    if kind == 0:
        call["leases"].remove(lease)
    elif kind == 1:
        lease["end"] += 10
    elif kind == 2:
        lease["slot"] += 1
    elif kind == 3 and lease["kind"] == "clean":
        lease["lender"] = draw.choice(sorted(data["wires"]))
    else:
        lease["kind"] = "borrowed" if lease["kind"] == "clean" else "clean"
    return spoiled


def _shift(step: Data, by: int) -> None:
    step["start"] += by
    step["end"] += by
    for lease in step["leases"]:
        lease["start"] += by
        lease["end"] += by


def order_broken(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    late = [c for c in spoiled["calls"] if c["start"] > 0]
    if not late:
        return None
    call = draw.choice(late)
    _shift(call, -call["start"])
    return spoiled


def duration_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    by = draw.choice([1, 7, 1000])
    if spoiled["others"] and draw.random() < 0.5:
        draw.choice(spoiled["others"])[2] += by
        return spoiled
    call = draw.choice(spoiled["calls"])
    call["end"] += by
    for lease in call["leases"]:
        lease["end"] += by
    return spoiled


def two_things_one_site(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    leased = calls_with(spoiled, "clean")
    kept = kept_wires(data)
    if leased and draw.random() < 0.5:
        lease = draw.choice(draw.choice(leased)["leases"])
        lease["site"] = spoiled["wires"][draw.choice(unknown_wires(data) or kept)]
        return spoiled
    first, second = draw.sample(kept, 2)
    spoiled["wires"][first] = spoiled["wires"][second]
    return spoiled


def lender_busy(data: Data, draw: random.Random) -> Data | None:
    # Lend the site of one of the call's own operands.
    spoiled = copy.deepcopy(data)
    lent = lent_leases(spoiled)
    if not lent:
        return None
    call, lease = draw.choice(lent)
    operand = draw.choice(operands_of(spoiled, call))
    lease["lender"] = operand
    lease["site"] = spoiled["wires"][operand]
    return spoiled


def lender_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    lent = lent_leases(spoiled)
    if not lent:
        return None
    _, lease = draw.choice(lent)
    others = [name for name in sorted(data["wires"]) if name != lease["lender"]]
    lease["lender"] = draw.choice([None, "nobody", *others])
    return spoiled


def estimate_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    bound = spoiled["bound"]
    bound["estimate"] += draw.randint(1, 10**9)
    bound["proven"] = bound["least"] == bound["estimate"]
    if bound["least"] is not None:
        bound["gap"] = (bound["estimate"] - bound["least"]) / bound["estimate"]
    return spoiled


def route_incomplete(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    route = spoiled["route"]
    gaps = [gap for gap in route["gaps"] if gap]
    if not gaps:
        return None
    gap = draw.choice(gaps)
    kind = draw.randrange(4)
    if kind == 0:
        gap.append(list(draw.choice(gap)))
    elif kind == 1:
        gap.pop(draw.randrange(len(gap)))
    elif kind == 2:
        gap[-1][1] += 10**6
    else:
        route["gaps"].insert(draw.randrange(len(route["gaps"])), [])
    return spoiled


def route_off_link(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    swaps = spoiled["route"]["swaps"]
    if not swaps:
        return None
    linked = {frozenset(pair) for pair in _links(data)}
    swap = draw.choice(swaps)
    sites = range(max(max(pair) for pair in _links(data)) + 1)
    apart = [p for p in sites if frozenset((swap[0], p)) not in linked]
    swap[1] = draw.choice(apart)
    return spoiled


def figures_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    figures = spoiled["figures"]
    if draw.random() < 0.5:
        figures[draw.choice(COUNTED)] += draw.randint(1, 3)
    else:
        # Of decay, one unit per wait is left to the last bit of exp.
        cause = draw.choice(sorted(figures["costs"]))
        figures["costs"][cause] += 10**6 if cause == "decay" else 1
    return spoiled


def success_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    value = spoiled["figures"]["success"] * (1 - draw.choice([1e-6, 1e-3, -1e-7]))
    spoiled["figures"]["success"] = value
    for limit in spoiled["verdict"]["limits"]:
        if limit["name"] == "success":
            limit["value"] = value
    return spoiled


def _with_bound(data: Data, **changes: Any) -> Data:
    """Return the plan with another bound, gap and proof as they follow from it."""
    spoiled = copy.deepcopy(data)
    bound = spoiled["bound"]
    bound.update(changes)
    estimate, least = bound["estimate"], bound["least"]
    bound["proven"] = least == estimate
    bound["gap"] = None if least is None else (estimate - least) / estimate
    return spoiled


def bound_above_estimate(data: Data, draw: random.Random) -> Data | None:
    return _with_bound(data, least=data["bound"]["estimate"] + draw.randint(1, 10**9))


def floor_above_cost(data: Data, draw: random.Random) -> Data | None:
    return _with_bound(data, floor=data["figures"]["cost"] + draw.randint(1, 10**9))


def proof_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    bound = spoiled["bound"]
    kind = draw.randrange(3)
    if kind == 0:
        bound["proven"] = not bound["proven"]
    elif kind == 1:
        bound["gap"] = None if bound["gap"] is not None else 0.5
    else:
        bound["gap"] = (bound["gap"] or 0.0) + 1e-3
    return spoiled


def policy_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    row = draw.choice(spoiled["policies"])
    kind = draw.randrange(4)
    if kind == 0:
        row["fits"] = not row["fits"]
    elif kind == 1:
        row["possible"] = not row["possible"]
    elif kind == 2 and row["figures"] is not None:
        row["figures"]["success"] *= 0.99
    else:
        spoiled["policies"].append(copy.deepcopy(row))
    return spoiled


def header_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    key = draw.choice(["calibrated", "assumed"])
    spoiled[key] += " or so"
    return spoiled


def step_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    call = draw.choice(spoiled["calls"])
    kind = draw.randrange(3)
    if kind == 0:
        call["line"] += draw.randint(1, 5)
    elif kind == 1:
        call["kind"] = {"mcx": "mcz"}.get(call["kind"], "mcx")
    else:
        call["name"] += "x"
    return spoiled


def workspace_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    call = draw.choice(spoiled["calls"])
    others = {"clean", "borrowed", "level2", "none"} - {call["workspace"]}
    call["workspace"] = draw.choice(sorted(others))
    return spoiled


def lost_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    call = draw.choice(spoiled["calls"])
    if call["lost"] and draw.random() < 0.5:
        call["lost"].pop(draw.randrange(len(call["lost"])))
    else:
        name = draw.choice([call["recipe"], "no-such-recipe"])
        call["lost"].append([name, "no reason"])
    return spoiled


def share_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    figures = spoiled["figures"]
    if draw.random() < 0.5:
        figures["worst_value"] += "?"
    else:
        figures["worst_share"] = figures["worst_share"] * 0.999 + 1e-6
    return spoiled


def limit_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    limits = spoiled["verdict"]["limits"]
    limit = draw.choice(limits)
    kind = draw.randrange(5)
    if kind == 0:
        limit["value"] += 0.25
    elif kind == 1:
        limit["limit"] = 0.99 if limit["limit"] is None else None
    elif kind == 2:
        limit["holds"] = not limit["holds"]
    elif kind == 3:
        limits.remove(limit)
    else:
        limit["about"] += "x"
    return spoiled


def verdict_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    verdict = spoiled["verdict"]
    fits = verdict["fits"]
    if draw.random() < 0.5:
        verdict["fits"] = not fits
    if verdict["fits"] == fits or draw.random() < 0.5:
        verdict["sentence"] = "does not fit: no" if fits else "fits: yes"
    return spoiled


def slot_not_clean(data: Data, draw: random.Random) -> Data | None:
    # A clean slot where a wire sits that may hold anything.
    spoiled = copy.deepcopy(data)
    leases = [x for c in spoiled["calls"] for x in c["leases"] if x["kind"] == "clean"]
    holders = unknown_wires(data)
    if not leases or not holders:
        return None
    draw.choice(leases)["site"] = spoiled["wires"][draw.choice(holders)]
    return spoiled


def function_differs(data: Data, draw: random.Random) -> Data | None:
    # Two wires that may hold anything on one site: one of them gets lost.
    used = [name for name in kept_wires(data) if name in unknown_wires(data)]
    if len(used) < 2:
        return None
    spoiled = copy.deepcopy(data)
    first, second = draw.sample(used, 2)
    spoiled["wires"][first] = spoiled["wires"][second]
    return spoiled


def workspace_not_returned(data: Data, draw: random.Random) -> Data | None:
    source = data["program"]
    program = read_program(source["text"], source["path"])
    if data.get("cleanup", {}).get("moves"):
        return None
    steps: dict[int, list[int]] = {}
    for op in program.operations:
        for wire in op.wires:
            if program.register_at(wire).workspace:
                steps.setdefault(wire, []).append(op.index)
    calls = {call["index"]: call for call in data["calls"]}
    computing = [steps[w][0] for w in sorted(steps) if steps[w][0] in calls]
    if not computing:
        return None
    spoiled = copy.deepcopy(data)
    index = draw.choice(computing)
    call = next(c for c in spoiled["calls"] if c["index"] == index)
    # What computes the value comes after everything else, also after its cleanup.
    ends = [row[2] for row in data["others"]] + [c["end"] for c in data["calls"]]
    _shift(call, max(ends) + draw.randint(0, 100) - call["start"])
    return spoiled


def _with_extra_swap(data: Data, draw: random.Random, rule: str) -> Data | None:
    """Insert a swap at random until the check names the rule, a few times at most.

    Whether a swap meets something in level 2 depends on where everything is by then;
    the check is the only one who knows, so it is asked.
    """
    if not any(c["workspace"] == "level2" for c in data["calls"]):
        return None
    count = sum(
        last - first + 1 for gap in data["route"]["gaps"] for first, last in gap
    )
    pairs = _links(data)
    for _ in range(60):
        spoiled = copy.deepcopy(data)
        route = spoiled["route"]
        cut = draw.randrange(1, count)
        flat = [
            (gap, gate)
            for gap, runs in enumerate(route["gaps"])
            for first, last in runs
            for gate in range(first, last + 1)
        ]
        at, _ = flat[cut]
        before = [[g, g] for gap, g in flat[:cut] if gap == at]
        after = [[g, g] for gap, g in flat[cut:] if gap == at]
        route["gaps"][at : at + 1] = [before, after]
        route["swaps"].insert(at, list(draw.choice(pairs)))
        found = check_plan(json.dumps(spoiled)).findings
        if any(f.rule == rule for f in found):
            return spoiled
    return None


def _links(data: Data) -> list[tuple[int, int]]:
    device = read_device(data["device"]["text"], data["device"]["path"])
    return [(k.a, k.b) for k in device.links if device.is_usable(k)]


def swap_while_level2(data: Data, draw: random.Random) -> Data | None:
    return _with_extra_swap(data, draw, "swap-while-level2")


BREAKERS: dict[str, Breaker] = {
    **CLEANUP_BREAKERS,
    "plan-malformed": malformed,
    "source-changed": source_changed,
    "header-misstated": header_misstated,
    "step-missing": step_missing,
    "step-misstated": step_misstated,
    "wire-missing": wire_missing,
    "site-unknown": site_unknown,
    "site-out-of-service": broken_sources.site_out_of_service,
    "recipe-unknown": recipe_unknown,
    "workspace-misstated": workspace_misstated,
    "lease-wrong": lease_wrong,
    "lost-misstated": lost_misstated,
    "recipe-excluded": recipe_excluded,
    "capability-missing": broken_sources.capability_missing,
    "level2-missing": broken_sources.level2_missing,
    "link-out-of-reach": broken_sources.link_out_of_reach,
    "order-broken": order_broken,
    "duration-misstated": duration_misstated,
    "two-things-one-site": two_things_one_site,
    "lender-busy": lender_busy,
    "lender-unlendable": broken_sources.lender_unlendable,
    "lender-misstated": lender_misstated,
    "estimate-misstated": estimate_misstated,
    "function-differs": function_differs,
    "slot-not-clean": slot_not_clean,
    "workspace-not-returned": workspace_not_returned,
    "route-incomplete": route_incomplete,
    "route-off-link": route_off_link,
    "level2-off-link": broken_sources.level2_off_link,
    "swap-while-level2": swap_while_level2,
    "figures-misstated": figures_misstated,
    "share-misstated": share_misstated,
    "success-misstated": success_misstated,
    "bound-above-estimate": bound_above_estimate,
    "floor-above-cost": floor_above_cost,
    "proof-misstated": proof_misstated,
    "policy-misstated": policy_misstated,
    "limit-misstated": limit_misstated,
    "verdict-misstated": verdict_misstated,
}

# What holds another site or another time is somewhere else, at another price, in the
# way of others, and may find or leave other values.
_MOVED = {
    "borrowed-changed",
    "duration-misstated",
    "estimate-misstated",
    "figures-misstated",
    "function-differs",
    "lender-busy",
    "lender-misstated",
    "level2-missing",
    "level2-off-link",
    "route-incomplete",
    "route-off-link",
    "share-misstated",
    "slot-not-clean",
    "slot-not-returned",
    "two-things-one-site",
    "workspace-not-returned",
}
_WITHOUT_LEVEL2 = {
    "duration-misstated",
    "estimate-misstated",
    "level2-missing",
    "level2-off-link",
    "link-out-of-reach",
    "swap-while-level2",
}

FOLLOWS: dict[str, set[str]] = {
    **CLEANUP_FOLLOWS,
    "site-out-of-service": _MOVED | {"link-out-of-reach"},
    # Without a latency, or of another length, everything takes another time.
    "capability-missing": {
        "duration-misstated",
        "estimate-misstated",
        "figures-misstated",
        "share-misstated",
    },
    "duration-misstated": {
        "estimate-misstated",
        "lender-busy",
        "order-broken",
        "two-things-one-site",
    },
    # Leases of another kind are cleaned and charged in another way.
    "lease-wrong": {
        "estimate-misstated",
        "figures-misstated",
        "lender-misstated",
        "share-misstated",
        "slot-not-clean",
        "two-things-one-site",
    },
    "lender-misstated": {
        "estimate-misstated",
        "figures-misstated",
        "share-misstated",
    },
    "lender-busy": _MOVED,
    "order-broken": _MOVED,
    "two-things-one-site": _MOVED,
    "function-differs": _MOVED,
    "slot-not-clean": _MOVED,
    "workspace-not-returned": _MOVED | {"order-broken"},
    "level2-missing": _WITHOUT_LEVEL2,
    "link-out-of-reach": _WITHOUT_LEVEL2,
    "level2-off-link": _WITHOUT_LEVEL2,
    "route-incomplete": {"route-off-link"},
    "swap-while-level2": {"level2-off-link", "route-off-link"},
    # The limits repeat some figures, and the success sums them up.
    "figures-misstated": {
        "cleanup-misstated",
        "limit-misstated",
        "success-misstated",
    },
    "share-misstated": {"cleanup-misstated", "limit-misstated"},
    # The row of the order that was taken repeats the figures.
    "success-misstated": {"cleanup-misstated"},
    # A circuit that is wrong at one level or both.
    "slot-not-returned": {"recipe-wrong", *_MOVED},
    "borrowed-changed": {"recipe-wrong", *_MOVED},
    "recipe-wrong": {"function-differs", "level2-off-link", *_MOVED},
}
