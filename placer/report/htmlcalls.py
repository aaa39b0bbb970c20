"""Each call of a report: what it got, what it could have had, and why not.

In: a story.  Out: rows of ready cells.  Needs and counts are those of the recipes'
circuits; the reasons are the plan's own words.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from markupsafe import Markup

from placer.problem import every_recipe
from placer.report.facts import fact, part
from placer.report.htmlrows import POLICY_WORDS

if TYPE_CHECKING:
    from collections.abc import Mapping

    from placer.program.model import Operation
    from placer.recipes.circuit import Built
    from placer.report.story import Story

Row = dict[str, Any]
TWO_BODY = ("cx", "cz", "level2")


def needs_of(built: Built) -> dict[str, int]:
    """Return what a recipe asks for and does, counted from its circuit."""
    names = [op.name for op in built.fine.ops]
    clean = sum(1 for slot in built.slots if slot == "clean")
    return {
        "clean": clean,
        "borrowed": len(built.slots) - clean,
        "level2": len(built.level2_wires),
        "two_body": sum(1 for name in names if name in TWO_BODY),
        "t": sum(1 for name in names if name in ("t", "tdg")),
        "measured": names.count("measure"),
    }


class _Recipes:
    """Needs of the recipes of each sort of call, counted once."""

    def __init__(self) -> None:
        self.known: dict[Any, dict[str, dict[str, int]]] = {}

    def of(self, op: Operation) -> dict[str, dict[str, int]]:
        """Return needs by name of the recipe."""
        sort = (op.kind, op.controls, op.params, op.inverse, op.signature)
        if sort not in self.known:
            self.known[sort] = {b.recipe: needs_of(b) for b in every_recipe(op)}
        return self.known[sort]


def calls(story: Story) -> list[Row]:
    """Return every call in order of its start on the route."""
    recipes = _Recipes()
    rows = [_call(story, k, call, recipes) for k, call in _numbered(story)]
    return sorted(rows, key=lambda row: (row["begin"], row["index"]))


def _numbered(story: Story) -> list[tuple[int, Mapping[str, Any]]]:
    return list(enumerate(story.data["calls"]))


def _call(story: Story, number: int, call: Mapping[str, Any], recipes: _Recipes) -> Row:
    index = call["index"]
    op = story.program.operations[index]
    begin, end = story.when.get(index, (0, 0))
    one = story.of_step.get(index)
    needs = recipes.of(op)
    whole = story.data["figures"]["cost"]
    considered = [_recipe(number, call["recipe"], needs, "")]
    considered += [_recipe(number, name, needs, why) for name, why in call["lost"]]
    return {
        "index": index,
        "begin": begin,
        "name": call["name"],
        "title": op.title,
        "line": call["line"],
        "wires": ", ".join(story.program.wire_names[w] for w in op.wires),
        "recipe": call["recipe"],
        "workspace": _workspace(call),
        "start": fact(begin, f"when/{index}/start", "duration"),
        "end": fact(end, f"when/{index}/end", "duration"),
        "share": part(
            one.total if one is not None else 0,
            whole,
            f"by/step/{index}/total",
            "figures/cost",
        ),
        "considered": considered,
        "count": len(considered),
    }


def _workspace(call: Mapping[str, Any]) -> Markup:
    """Return where a call's workspace sits, with links to the map."""
    if not call["leases"]:
        words = POLICY_WORDS.get(call["workspace"], call["workspace"])
        return Markup("{}").format(words.removesuffix(" only"))
    found = []
    for lease in call["leases"]:
        if lease["kind"] == "clean":
            words = "clean"
        elif lease["lender"] is None:
            words = "borrowed, unheld"
        else:
            words = f"lent by {lease['lender']}"
        found.append(
            Markup('<span data-site="{0}">site {0}</span> ({1})').format(
                lease["site"], words
            )
        )
    return Markup(", ").join(found)


def _recipe(
    number: int, name: str, needs: Mapping[str, dict[str, int]], why: str
) -> Row:
    counts = needs.get(name)
    if counts is None:
        return {"name": name, "needs": "", "two_body": "", "t": "", "why": why}
    base = f"recipe/{number}/{name}"
    asked = [
        Markup("{} {}").format(fact(counts[key], f"{base}/{key}", "count"), words)
        for key, words in (
            ("clean", "clean"),
            ("borrowed", "borrowed"),
            ("level2", "on level 2"),
        )
        if counts[key]
    ]
    if counts["measured"]:
        asked.append(Markup("measurement"))
    return {
        "name": name,
        "needs": Markup(", ").join(asked) or "nothing",
        "two_body": fact(counts["two_body"], f"{base}/two_body", "count"),
        "t": fact(counts["t"], f"{base}/t", "count"),
        "why": why,
    }
