"""Spoil a good plan in exactly one way, one breaker per rule of the check.

A breaker takes the parsed JSON of a good plan and a random generator, and returns a
spoiled copy, or `None` if this plan offers no chance.  Rules about what a recipe
computes cannot be broken from the file alone, since recipes are built again by the
check: their breakers spoil the catalog (see `SPOILED_RECIPES`).
"""

from __future__ import annotations

import copy
import dataclasses
import hashlib
import json
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from placer.recipes.circuit import Built, Circuit, Op

if TYPE_CHECKING:
    import random

Data = dict[str, Any]
Breaker = Callable[[Data, "random.Random"], Data | None]


def _calls(data: Data, *, leased: str = "") -> list[Data]:
    calls = [c for c in data["calls"] if c["kind"] != ""]
    if leased:
        calls = [c for c in calls if any(s["kind"] == leased for s in c["leases"])]
    return calls


def malformed(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    key = draw.choice(["figures", "bound", "wires", "route", "calls"])
    if draw.random() < 0.5:
        del spoiled[key]
    else:
        spoiled[key] = "nonsense"
    return spoiled


def source_changed(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    which = draw.choice(["program", "device"])
    spoiled[which]["hash"] = hashlib.sha256(b"other").hexdigest()
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
    name = draw.choice(sorted(spoiled["wires"]))
    spoiled["wires"][name] = 5000
    return spoiled


def site_out_of_service(data: Data, draw: random.Random) -> Data | None:
    if "out_of_order: [" not in data["device"]["text"]:
        return None
    text = data["device"]["text"].split("out_of_order: [")[1].split("]")[0]
    spoiled = copy.deepcopy(data)
    name = draw.choice(sorted(spoiled["wires"]))
    spoiled["wires"][name] = int(draw.choice(text.split(",")))
    return spoiled


def steps_incomplete(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    rows = spoiled[draw.choice(["calls", "others"])]
    if not rows:
        return None
    rows.pop(draw.randrange(len(rows)))
    return spoiled


def recipe_unknown(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    draw.choice(spoiled["calls"])["recipe"] = "no-such-recipe"
    return spoiled


def recipe_excluded(data: Data, draw: random.Random) -> Data | None:
    used = {c["workspace"] for c in data["calls"] if c["recipe"] != "toffoli"}
    others = sorted({"clean", "borrowed", "level2", "none"} - used)
    if not used or data["only"]:
        return None
    spoiled = copy.deepcopy(data)
    spoiled["only"] = [draw.choice(others)]
    return spoiled


def capability_missing(data: Data, _: random.Random) -> Data | None:
    text = data["device"]["text"]
    measured = [c for c in data["calls"] if "measured" in c["recipe"]]
    line = next((x for x in text.splitlines() if "conditional_latency_ns" in x), None)
    if not measured or line is None:
        return None
    return _with_device(data, text.replace(line, "  conditional_latency_ns: none"))


def _with_device(data: Data, text: str) -> Data:
    """Return the plan with another device text and the hash that fits it."""
    from placer.device.read import read_device

    spoiled = copy.deepcopy(data)
    device = read_device(text, data["device"]["path"])
    spoiled["device"]["text"] = text
    spoiled["device"]["hash"] = device.hash
    return spoiled


def level2_missing(data: Data, _: random.Random) -> Data | None:
    if not any(c["workspace"] == "level2" for c in data["calls"]):
        return None
    out = []
    for line in data["device"]["text"].splitlines():
        kept = line
        if line.lstrip().startswith("level2_sites:"):
            kept = line[: line.index("level2_sites:")] + "level2_sites: none"
        out.append(kept)
    return _with_device(data, "\n".join(out) + "\n")


def lease_wrong(data: Data, draw: random.Random) -> Data | None:
    calls = [c for c in data["calls"] if c["leases"]]
    if not calls:
        return None
    spoiled = copy.deepcopy(data)
    call = draw.choice([c for c in spoiled["calls"] if c["leases"]])
    lease = draw.choice(call["leases"])
    kind = draw.randrange(3)
    if kind == 0:
        call["leases"].remove(lease)
    elif kind == 1:
        lease["end"] += 10
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
    call = draw.choice(spoiled["calls"])
    call["end"] += 7
    for lease in call["leases"]:
        lease["end"] += 7
    return spoiled


def two_things_one_site(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    calls = [
        c for c in spoiled["calls"] if any(x["kind"] == "clean" for x in c["leases"])
    ]
    if calls and draw.random() < 0.5:
        lease = draw.choice(draw.choice(calls)["leases"])
        lease["site"] = draw.choice(sorted(spoiled["wires"].values()))
        return spoiled
    first, second = draw.sample(sorted(spoiled["wires"]), 2)
    spoiled["wires"][first] = spoiled["wires"][second]
    return spoiled


def _lent(data: Data) -> list[tuple[Data, Data]]:
    return [(c, x) for c in data["calls"] for x in c["leases"] if x["lender"]]


def lender_busy(data: Data, draw: random.Random) -> Data | None:
    # Lend the site of one of the call's own operands.
    spoiled = copy.deepcopy(data)
    lent = _lent(spoiled)
    if not lent:
        return None
    call, lease = draw.choice(lent)
    operand = _operands(spoiled, call)[0]
    lease["lender"] = operand
    lease["site"] = spoiled["wires"][operand]
    return spoiled


def _operands(data: Data, call: Data) -> list[str]:
    from placer.program.read import read_program

    program = read_program(data["program"]["text"], data["program"]["path"])
    op = program.operations[call["index"]]
    return [program.wire_names[w] for w in op.wires]


def lender_unlendable(data: Data, draw: random.Random) -> Data | None:
    from placer.program.read import read_program

    lent = _lent(data)
    if not lent or data["program"]["syntax"] != "openqasm3":
        return None
    _, lease = draw.choice(lent)
    register = lease["lender"].split("[")[0]
    lines = []
    for line in data["program"]["text"].splitlines():
        if line.startswith("qubit") and line.rstrip(";").split()[-1] == register:
            lines.append("@placer.keep")
        lines.append(line)
    spoiled = copy.deepcopy(data)
    text = "\n".join(lines) + "\n"
    program = read_program(text, data["program"]["path"])
    spoiled["program"]["text"] = text
    spoiled["program"]["hash"] = program.hash
    for call in spoiled["calls"]:
        call["line"] = program.operations[call["index"]].place.line
    return spoiled


def lender_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    lent = _lent(spoiled)
    if not lent:
        return None
    draw.choice(lent)[1]["lender"] = None
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
    gaps = [gap for gap in spoiled["route"]["gaps"] if gap]
    if not gaps:
        return None
    gap = draw.choice(gaps)
    if draw.random() < 0.5:
        gap.append(list(gap[0]))
    else:
        gap.pop()
    return spoiled


def route_off_link(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    swaps = spoiled["route"]["swaps"]
    if not swaps:
        return None
    swaps[draw.randrange(len(swaps))][1] = swaps[0][0] + 7
    return spoiled


def figures_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    figures = spoiled["figures"]
    name = draw.choice(["two_qubit_gates", "t_gates", "measurements", "level2_gates"])
    if draw.random() < 0.5:
        figures[name] += 1
    else:
        cause = draw.choice(sorted(figures["costs"]))
        figures["costs"][cause] += 1
    return spoiled


def success_misstated(data: Data, _: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    value = spoiled["figures"]["success"] * (1 - 1e-6)
    spoiled["figures"]["success"] = value
    for limit in spoiled["verdict"]["limits"]:
        if limit["name"] == "success":
            limit["value"] = value
    return spoiled


def bound_above_cost(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    if draw.random() < 0.5:
        spoiled["bound"]["floor"] = spoiled["figures"]["cost"] + 1
        return spoiled
    bound = spoiled["bound"]
    bound["least"] = bound["estimate"] + 1
    bound["gap"] = -1 / bound["estimate"]
    bound["proven"] = False
    return spoiled


def limit_misstated(data: Data, draw: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    limit = draw.choice(spoiled["verdict"]["limits"])
    limit["value"] += 0.25
    return spoiled


def verdict_misstated(data: Data, _: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    spoiled["verdict"]["fits"] = not spoiled["verdict"]["fits"]
    return spoiled


BREAKERS: dict[str, Breaker] = {
    "plan-malformed": malformed,
    "source-changed": source_changed,
    "wire-missing": wire_missing,
    "site-unknown": site_unknown,
    "site-out-of-service": site_out_of_service,
    "steps-incomplete": steps_incomplete,
    "recipe-unknown": recipe_unknown,
    "recipe-excluded": recipe_excluded,
    "capability-missing": capability_missing,
    "level2-missing": level2_missing,
    "lease-wrong": lease_wrong,
    "order-broken": order_broken,
    "duration-misstated": duration_misstated,
    "two-things-one-site": two_things_one_site,
    "lender-busy": lender_busy,
    "lender-unlendable": lender_unlendable,
    "lender-misstated": lender_misstated,
    "estimate-misstated": estimate_misstated,
    "route-incomplete": route_incomplete,
    "route-off-link": route_off_link,
    "figures-misstated": figures_misstated,
    "success-misstated": success_misstated,
    "bound-above-cost": bound_above_cost,
    "limit-misstated": limit_misstated,
    "verdict-misstated": verdict_misstated,
}


def _edited(built: Built, change: Callable[[Circuit], Circuit]) -> Built:
    return dataclasses.replace(
        built, coarse=change(built.coarse), fine=change(built.fine)
    )


def leave_slot_set(built: Built) -> Built:
    """Return the recipe with its first clean slot flipped at the end."""
    slot = built.fine.operands + built.slots.index("clean")
    return _edited(
        built,
        lambda c: dataclasses.replace(c, ops=(*c.ops, Op("x", (slot,)))),
    )


def leave_borrowed_changed(built: Built) -> Built:
    """Return the recipe with its first borrowed slot flipped at the end."""
    slot = built.fine.operands + built.slots.index("borrowed")
    return _edited(
        built,
        lambda c: dataclasses.replace(c, ops=(*c.ops, Op("x", (slot,)))),
    )


def flip_target(built: Built) -> Built:
    """Return the recipe with its target flipped once too often."""
    target = built.fine.operands - 1
    return _edited(
        built,
        lambda c: dataclasses.replace(c, ops=(*c.ops, Op("x", (target,)))),
    )


SPOILED_RECIPES: dict[str, tuple[str, Callable[[Built], Built]]] = {
    "slot-not-returned": ("clean", leave_slot_set),
    "borrowed-changed": ("borrowed", leave_borrowed_changed),
    "function-differs": ("", flip_target),
}


def _with_extra_swap(data: Data, draw: random.Random, rule: str) -> Data | None:
    """Insert a swap at random until the check names the rule, a few times at most.

    Whether a swap meets something in level 2 depends on where everything is by then;
    the check is the only one who knows, so it is asked.
    """
    from placer.check.verify import check_plan

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
    from placer.device.read import read_device

    device = read_device(data["device"]["text"], data["device"]["path"])
    return [(k.a, k.b) for k in device.links if device.is_usable(k)]


def level2_off_link(data: Data, draw: random.Random) -> Data | None:
    # A site that a chain passes through loses its third level: its gates then find
    # no fitting link, at home and on the route.
    used = [c for c in data["calls"] if c["workspace"] == "level2"]
    if not used:
        return None
    inner = _operands(data, draw.choice(used))[1:-1]
    site = data["wires"][draw.choice(inner)]
    out = []
    for line in data["device"]["text"].splitlines():
        kept = line
        if line.lstrip().startswith("level2_sites:"):
            head, listed = line.split("[")
            left = [x for x in listed.rstrip("]").split(",") if int(x) != site]
            kept = f"{head}[{','.join(left)}]"
        if line.startswith(f"  {site}:"):
            kept = line[: line.index(", level2")] + "}"
        out.append(kept)
    return _with_device(data, "\n".join(out) + "\n")


def swap_while_level2(data: Data, draw: random.Random) -> Data | None:
    return _with_extra_swap(data, draw, "swap-while-level2")


BREAKERS["level2-off-link"] = level2_off_link
BREAKERS["swap-while-level2"] = swap_while_level2
SPOILED_RECIPES["slot-not-clean"] = ("clean", leave_slot_set)
