"""What a notebook shows of a plan: the verdict, the map, the timeline.

In: a plan.  Out: one HTML text with its own style, for a cell.  Nothing of a notebook
is needed or asked for.
"""

from __future__ import annotations

import json
from typing import TYPE_CHECKING

from markupsafe import Markup

from placer.plan import to_json
from placer.report.devicemap import role_map
from placer.report.html import environment
from placer.report.story import read_story
from placer.report.text import verdict_line
from placer.report.timeline import timelines

if TYPE_CHECKING:
    from placer.plan import Plan


def picture(plan: Plan) -> str:
    """Return a plan as a cell of a notebook shows it."""
    story = read_story(json.loads(to_json(plan)))
    return (
        environment()
        .get_template("notebook.html")
        .render(
            plan=plan,
            line=verdict_line(plan),
            role_map=Markup(role_map(story)),
            timelines=[Markup(panel) for panel in timelines(story)],
        )
    )
