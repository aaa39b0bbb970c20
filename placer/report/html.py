"""Make a report: one HTML file from a plan's data, offline, the same bytes every time.

In: the data of a plan that has passed its check.  Out: the whole text.  Rows come from
`htmlrows` and `htmlcalls`, drawings from `devicemap`, `timeline` and `charts`; this
file puts them into the templates.
"""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Any

import jinja2
from markupsafe import Markup

from placer.check.rules import RULES
from placer.report import charts, htmlcalls, htmlrows
from placer.report.devicemap import error_map, link_ends, role_map, shade_of, site_ends
from placer.report.facts import Facts, fact
from placer.report.htmlcleanup import cleanup_view
from placer.report.palette import variables
from placer.report.story import read_story
from placer.report.timeline import ROW_PITCH, TOP, rows_of, timelines
from placer.report.words import count
from placer.units import nats

if TYPE_CHECKING:
    from collections.abc import Mapping

    from placer.report.story import Story

MOST_LINES = 4000


def environment() -> jinja2.Environment:
    """Return the templates, with every text escaped."""
    made = jinja2.Environment(
        loader=jinja2.PackageLoader("placer.report", "templates"),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    made.globals.update(
        light=Markup(variables(0)),
        dark=Markup(variables(1)),
        count=count,
        shade=shade_of,
    )
    return made


def report_html(data: Mapping[str, Any]) -> str:
    """Return the report of a plan.

    `data` is the data of a plan file; it must have passed its check.
    """
    story = read_story(data)
    return environment().get_template("report.html").render(view(story))


def view(story: Story) -> dict[str, Any]:
    """Return everything that the template of a report shows."""
    facts = Facts(story.data)
    choices = htmlrows.choices(facts)
    causes = htmlrows.causes(story)
    return {
        "plan": story.data,
        "facts": facts,
        "story": story,
        "fits": story.data["verdict"]["fits"],
        "sentence": _sentence(story.data["verdict"]["sentence"]),
        "limits": htmlrows.limits(facts),
        "choices": choices,
        "choice_chart": Markup(_choice_chart(choices)),
        "causes": causes,
        "main_cause": causes[0] if causes else None,
        "by_call": htmlrows.by_call(story),
        "by_site": htmlrows.by_site(story),
        "by_link": htmlrows.by_link(story),
        "lives": htmlrows.lives(story),
        "most": htmlrows.MOST_ROWS,
        "role_map": Markup(role_map(story)),
        "error_map": Markup(error_map(story)),
        "legend": _legend(story),
        "sites": htmlrows.sites(story),
        "timelines": [Markup(text) for text in timelines(story)],
        "events": _events(story),
        "calls": htmlcalls.calls(story),
        "cleanup": cleanup_view(facts),
        "rules": RULES,
        "source": story.data["program"]["text"].splitlines()[:MOST_LINES],
    }


def _sentence(text: str) -> str:
    """Return the verdict's sentence without its first word, which is shown apart."""
    for word in ("fits:", "does not fit:"):
        text = text.removeprefix(word)
    return text.strip()


def _choice_chart(choices: list[dict[str, Any]]) -> str:
    rows = [
        charts.Bars(
            row["title"].split(" (")[0], tuple((n, nats(c)) for n, c in row["costs"])
        )
        for row in choices
        if not row["reason"]
    ]
    return charts.bars(
        rows,
        name="choices",
        label="Expected error of each choice by cause, as in the two tables",
        unit="expected error, −ln(success)",
        words=htmlrows.CAUSE_WORDS,
    )


def _legend(story: Story) -> dict[str, list[tuple[int, Markup]]]:
    """Return the classes of the map's shades with their upper ends."""
    lives, errors = site_ends(story.device), link_ends(story.device)
    return {
        "sites": [
            (k, fact(end, f"class/site/{k}", "microseconds"))
            for k, end in enumerate(lives)
        ],
        "links": [
            (k, fact(end, f"class/link/{k}", "percent")) for k, end in enumerate(errors)
        ],
    }


def _events(story: Story) -> Markup:
    """Return what the page's script reads, safe inside a script element."""
    rows = {
        **rows_of(story),
        "end": story.replay.end,
        "pitch": ROW_PITCH,
        "top": TOP,
    }
    text = json.dumps(rows, separators=(",", ":"), ensure_ascii=True)
    for sign in "<>&":
        text = text.replace(sign, f"\\u{ord(sign):04x}")
    return Markup(text)


__all__ = ["environment", "report_html", "view"]
