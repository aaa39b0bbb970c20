"""Rows of a report's tables, every number with the path it comes from.

In: a story.  Out: plain rows of ready cells, for the templates.  Nothing is decided or
priced here.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from markupsafe import Markup

from placer.report.devicemap import roles_of
from placer.report.facts import Facts, fact, part, ratio
from placer.report.replay import NO_STEP
from placer.report.story import CAUSES
from placer.report.words import count

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, Sequence

    from placer.report.story import Part, Story

Row = dict[str, Any]
CAUSE_WORDS = {
    "decay": "waiting",
    "swaps": "swaps",
    "two_qubit": "two-qubit gates",
    "one_qubit": "one-qubit gates",
    "measurement": "measurement",
    "level2": "level-2 gates",
    "preparation": "reset, preparation",
}
POLICY_WORDS = {
    "clean": "clean only",
    "borrowed": "borrowed only",
    "level2": "level 2 only",
    "none": "no workspace",
}
MOST_ROWS = 12
_GATES = "two_qubit+one_qubit+measurement+level2+preparation"


def limits(facts: Facts) -> list[Row]:
    """Return every limit of the budget with what the plan uses of it."""
    rows = []
    for k, limit in enumerate(facts.data["verdict"]["limits"]):
        path = f"verdict/limits/{k}"
        way = {"ns": "duration", "sites": "count"}.get(limit["unit"], "percent")
        value, allowed = limit["value"], limit["limit"]
        used = share = None
        if allowed:
            used = ratio(value, allowed, f"{path}/value", f"{path}/limit", "percent")
            share = value / allowed
            if limit["unit"] == "probability":
                # Of a least success, the error that it allows is what is used up.
                used = ratio(
                    1 - value, 1 - allowed, f"{path}/-value", f"{path}/-limit",
                    "percent",
                ) if allowed < 1 else None  # fmt: skip
                share = (1 - value) / (1 - allowed) if allowed < 1 else None
        rows.append(
            {
                "name": limit["name"],
                "value": fact(value, f"{path}/value", way),
                "allowed": None
                if allowed is None
                else fact(allowed, f"{path}/limit", way),
                "used": used,
                "fill": None if share is None else min(100.0, 100 * share),
                "holds": limit["holds"],
                "about": limit["about"],
            }
        )
    return rows


def choices(facts: Facts) -> list[Row]:
    """Return the table of choices: the plan, each policy, each order of cleanup."""
    data = facts.data
    title = "chosen together"
    if data["only"]:
        title += f" ({', '.join(data['only'])})"
    rows = [_choice(facts, title, "figures", fits=data["verdict"]["fits"])]
    rows[0]["own"] = True
    for k, row in enumerate(data["policies"]):
        words = POLICY_WORDS.get(row["policy"], row["policy"])
        rows.append(_or_reason(facts, words, f"policies/{k}", row))
    cleanup = data.get("cleanup") or {"rows": [], "chosen": ""}
    for k, row in enumerate(cleanup["rows"]):
        words = f"cleanup {row['name']}"
        if row["name"] == cleanup["chosen"]:
            words += " (the order taken)"
        rows.append(_or_reason(facts, words, f"cleanup/rows/{k}", row))
    return rows


def _or_reason(facts: Facts, title: str, path: str, row: Mapping[str, Any]) -> Row:
    if row["figures"] is None:
        return {"title": title, "reason": row["reason"] or "no reason given"}
    return _choice(facts, title, f"{path}/figures", fits=row["fits"])


def _choice(facts: Facts, title: str, path: str, *, fits: bool) -> Row:
    figures = facts.value(path)
    costs = figures["costs"]
    gates = sum(costs[name] for name in _GATES.split("+"))
    return {
        "title": title,
        "reason": "",
        "sites": facts(f"{path}/sites", "count"),
        "swaps": facts(f"{path}/swaps", "count"),
        "time": facts(f"{path}/time_ns", "duration"),
        "idle": facts(f"{path}/costs/decay", "nats"),
        "moved": facts(f"{path}/costs/swaps", "nats"),
        "gates": fact(gates, f"{path}/costs/{_GATES}", "nats"),
        "success": facts(f"{path}/success", "percent"),
        "worst": facts(f"{path}/worst_share", "percent"),
        "fits": fits,
        "miss": Markup("") if fits else missed(facts, path),
        "costs": [(name, costs[name]) for name in CAUSES],
    }


def missed(facts: Facts, path: str) -> Markup:
    """Say by how much figures miss each limit that they break."""
    figures, budget = facts.value(path), facts.data["budget"]
    said = []
    if figures["worst_share"] > budget["share"]:
        times = ratio(
            figures["worst_share"],
            budget["share"],
            f"{path}/worst_share",
            "budget/share",
            "times",
        )
        said.append(Markup("a value lives {} times too long").format(times))
    for name, limit, way, sign, word in (
        ("success", "least_success", "percent", -1, "success"),
        ("sites", "most_sites", "count", 1, "sites"),
        ("time_ns", "longest_ns", "duration", 1, "run time"),
    ):
        allowed = budget[limit]
        if allowed is not None and sign * (figures[name] - allowed) > 0:
            shown = fact(allowed, f"budget/{limit}", way)
            said.append(Markup("{} {}").format(word, Markup("beyond {}").format(shown)))
    return Markup("; ").join(said)


def causes(story: Story) -> list[Row]:
    """Return the expected error by cause, the largest first."""
    costs, whole = story.data["figures"]["costs"], story.data["figures"]["cost"]
    ranked = sorted(CAUSES, key=lambda name: (-costs[name], CAUSES.index(name)))
    return [
        {
            "title": CAUSE_WORDS[name],
            "cost": fact(costs[name], f"figures/costs/{name}", "nats"),
            "share": part(costs[name], whole, f"figures/costs/{name}", "figures/cost"),
            "fill": 100 * costs[name] / whole if whole else 0.0,
        }
        for name in ranked
        if costs[name]
    ]


def parts_table(
    story: Story,
    parts: Mapping[Any, Part],
    path: str,
    title: Callable[[Any], Markup],
    key: Callable[[Any], str],
) -> list[Row]:
    """Return a split of the error as rows, the largest first."""
    whole = story.data["figures"]["cost"]
    ranked = sorted(parts.items(), key=lambda item: (-item[1].total, item[0]))
    rows = []
    for name, one in ranked:
        if not one.total:
            continue
        base = f"{path}/{key(name)}"
        rows.append(
            {
                "key": name,
                "title": title(name),
                "gates": fact(one.gates, f"{base}/gates", "nats"),
                "swaps": fact(one.swaps, f"{base}/swaps", "nats"),
                "waiting": fact(one.waiting, f"{base}/waiting", "nats"),
                "share": part(one.total, whole, f"{base}/total", "figures/cost"),
            }
        )
    return rows


def by_call(story: Story) -> list[Row]:
    """Return the error by call; everything else is one row each."""
    calls: dict[int, Any] = {}
    others = [0, 0, 0]
    for step, one in story.of_step.items():
        is_call = step != NO_STEP and story.program.operations[step].is_call
        if is_call or step == NO_STEP:
            calls[step] = one
        else:
            others[0] += one.gates
            others[1] += one.swaps
            others[2] += one.waiting
    if any(others):
        calls[-2] = type(next(iter(story.of_step.values())))(*others)

    def title(step: int) -> Markup:
        if step == -2:
            return Markup("all plain gates, measurements, resets")
        if step == NO_STEP:
            return Markup("waiting after a site's last step, to the end")
        return call_title(story, step)

    def key(step: int) -> str:
        return {-2: "plain", NO_STEP: "end"}.get(step, str(step))

    return parts_table(story, calls, "by/step", title, key)


def call_title(story: Story, step: int) -> Markup:
    """Return a call's name with a link to its place in the list of calls."""
    op = story.program.operations[step]
    at = f", line {op.place.line}" if op.place.line else ""
    return Markup('<a href="#call-{0}" data-call="{0}">{1}</a>').format(
        step, f"{op.name} {step}{at}"
    )


def by_site(story: Story) -> list[Row]:
    """Return the error by site: its own operations, and waiting on it."""
    return parts_table(
        story, story.of_site, "by/site", lambda site: Markup(f"site {site}"), str
    )


def by_link(story: Story) -> list[Row]:
    """Return the error by link: two-body gates and swaps."""
    return parts_table(
        story,
        story.of_link,
        "by/link",
        lambda pair: Markup(f"{pair[0]}–{pair[1]}"),
        lambda pair: f"{pair[0]}-{pair[1]}",
    )


def lives(story: Story) -> list[Row]:
    """Return the values that use most of their lifetime."""
    return [
        {"title": life.name, "share": fact(life.share, f"life/{k}", "percent")}
        for k, life in enumerate(story.lives)
    ]


def sites(story: Story) -> list[Row]:
    """Return every site that a plan touches, and those out of order."""
    roles = roles_of(story)
    whole = story.data["figures"]["cost"]
    rows = []
    for site in story.device.sites:
        used = site.id in roles.touched or site.id in roles.wires
        if not used and site.in_service:
            continue
        one = story.of_site.get(site.id)
        base = f"site/{site.id}"
        rows.append(
            {
                "id": site.id,
                "t1": fact(site.t1_us, f"{base}/t1_us", "microseconds"),
                "t2": fact(site.t2_us, f"{base}/t2_us", "microseconds"),
                "state": "" if site.in_service else "out of order",
                "level2": site.level2 is not None,
                "wires": ", ".join(roles.wires.get(site.id, [])),
                "leases": fact(roles.leases.get(site.id, 0), f"{base}/leases", "count"),
                "lent": fact(roles.lent.get(site.id, 0), f"{base}/lent", "count"),
                "share": part(
                    one.total if one is not None else 0,
                    whole,
                    f"by/site/{site.id}/total",
                    "figures/cost",
                ),
            }
        )
    return rows


def counted(rows: Sequence[Any], noun: str) -> str:
    """Return a number of rows with its noun."""
    return count(len(rows), noun)


def range_words(ends: Sequence[float], place: int, way: str, path: str) -> Markup:
    """Return the words of one class in a legend: up to its end."""
    return Markup("up to {}").format(fact(ends[place], f"{path}/{place}", way))
