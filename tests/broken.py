"""Spoil a good plan in exactly one way, one breaker per rule of the check.

A breaker takes the parsed JSON of a good plan and a random generator, and returns a
spoiled copy, or `None` if this plan offers no chance.  Rules about what a recipe
computes cannot be broken from the file alone, since recipes are built again by the
check: their breakers spoil what it builds (see `RECIPE_BREAKERS`).
"""

from __future__ import annotations

import copy
import dataclasses
import hashlib
import json
import random
import re
from collections.abc import Callable
from typing import Any

from placer.recipes.circuit import Built, Circuit, Op

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


def step_missing(data: Data, draw: random.Random) -> Data | None:
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
    # Two controls without a slot leave nothing to choose, and are always allowed.
    plain = ("toffoli", "and-mirror", "and-measured")
    used = {c["workspace"] for c in data["calls"] if c["recipe"] not in plain}
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
        # Of decay, one unit per wait is left to the last bit of exp.
        cause = draw.choice(sorted(figures["costs"]))
        figures["costs"][cause] += 10**6 if cause == "decay" else 1
    return spoiled


def success_misstated(data: Data, _: random.Random) -> Data | None:
    spoiled = copy.deepcopy(data)
    value = spoiled["figures"]["success"] * (1 - 1e-6)
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
    "step-missing": step_missing,
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
    "bound-above-estimate": bound_above_estimate,
    "floor-above-cost": floor_above_cost,
    "proof-misstated": proof_misstated,
    "policy-misstated": policy_misstated,
    "header-misstated": header_misstated,
    "step-misstated": step_misstated,
    "workspace-misstated": workspace_misstated,
    "lost-misstated": lost_misstated,
    "share-misstated": share_misstated,
    "limit-misstated": limit_misstated,
    "verdict-misstated": verdict_misstated,
}


def link_out_of_reach(data: Data, draw: random.Random) -> Data | None:
    # One site alone keeps its third level: two wires that both need it cannot meet.
    if not any(c["workspace"] == "level2" for c in data["calls"]):
        return None
    kept = draw.choice(_level2_sites(data))
    return _with_device(data, _only_level2(data["device"]["text"], [kept]))


def _level2_sites(data: Data) -> list[int]:
    text = data["device"]["text"].split("level2_sites: [")[1].split("]")[0]
    return [int(site) for site in text.split(",")]


def _only_level2(text: str, kept: list[int]) -> str:
    """Return a device text in which only some sites keep their third level."""
    lines = []
    for line in text.splitlines():
        site = re.match(r"  (\d+): ", line)
        if line.lstrip().startswith("level2_sites:"):
            lines.append(f"  level2_sites: [{', '.join(map(str, kept))}]")
        elif site and int(site[1]) not in kept:
            lines.append(re.sub(r", level2: \{[^}]*\}", "", line))
        else:
            lines.append(line)
    return "\n".join(lines) + "\n"


def slot_not_clean(data: Data, draw: random.Random) -> Data | None:
    # A clean slot where a wire sits that may hold anything.
    if data["program"]["syntax"] != "openqasm3":
        return None
    spoiled = copy.deepcopy(data)
    leases = [x for c in spoiled["calls"] for x in c["leases"] if x["kind"] == "clean"]
    if not leases:
        return None
    draw.choice(leases)["site"] = draw.choice(sorted(spoiled["wires"].values()))
    return spoiled


def function_differs(data: Data, draw: random.Random) -> Data | None:
    # Two wires that may hold anything on one site: one of them gets lost.
    if data["program"]["syntax"] != "openqasm3":
        return None
    spoiled = copy.deepcopy(data)
    used = {name for call in data["calls"] for name in _operands(data, call)}
    first, second = draw.sample(sorted(used), 2)
    spoiled["wires"][first] = spoiled["wires"][second]
    return spoiled


def workspace_not_returned(data: Data, draw: random.Random) -> Data | None:
    from placer.program.read import read_program

    source = data["program"]
    program = read_program(source["text"], source["path"])
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


def _edited(built: Built, change: Callable[[Circuit], Circuit]) -> Built:
    return dataclasses.replace(
        built, coarse=change(built.coarse), fine=change(built.fine)
    )


def _with_flip(built: Built, wire: int) -> Built:
    """Return the recipe with a wire flipped once too often, at the end."""
    flip = Op("x", (wire,))
    return _edited(built, lambda c: dataclasses.replace(c, ops=(*c.ops, flip)))


def leave_slot_set(built: Built, draw: random.Random) -> Built | None:
    clean = [s for s, kind in enumerate(built.slots) if kind == "clean"]
    return (
        _with_flip(built, built.fine.operands + draw.choice(clean)) if clean else None
    )


def leave_borrowed_changed(built: Built, draw: random.Random) -> Built | None:
    lent = [s for s, kind in enumerate(built.slots) if kind == "borrowed"]
    return _with_flip(built, built.fine.operands + draw.choice(lent)) if lent else None


def wrong_gate(built: Built, draw: random.Random) -> Built | None:
    """Return the recipe without one gate, or with one turned the other way."""
    level = draw.choice(["fine", "coarse"])
    circuit = getattr(built, level)
    at = draw.randrange(len(circuit.ops))
    op = circuit.ops[at]
    mirrors = {"t": "tdg", "tdg": "t", "s": "sdg", "sdg": "s"}
    other: tuple[Op, ...] = ()
    if op.name in mirrors and draw.random() < 0.5:
        other = (dataclasses.replace(op, name=mirrors[op.name]),)
    ops = (*circuit.ops[:at], *other, *circuit.ops[at + 1 :])
    made = dataclasses.replace(circuit, ops=ops)
    return dataclasses.replace(built, **{level: made})


BREAKERS.update(
    {
        "link-out-of-reach": link_out_of_reach,
        "slot-not-clean": slot_not_clean,
        "function-differs": function_differs,
        "workspace-not-returned": workspace_not_returned,
    }
)
RECIPE_BREAKERS: dict[str, Callable[[Built, random.Random], Built | None]] = {
    "slot-not-returned": leave_slot_set,
    "borrowed-changed": leave_borrowed_changed,
    "recipe-wrong": wrong_gate,
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
    left = [kept for kept in _level2_sites(data) if kept != site]
    return _with_device(data, _only_level2(data["device"]["text"], left))


def swap_while_level2(data: Data, draw: random.Random) -> Data | None:
    return _with_extra_swap(data, draw, "swap-while-level2")


BREAKERS["level2-off-link"] = level2_off_link
BREAKERS["swap-while-level2"] = swap_while_level2
