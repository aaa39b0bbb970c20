"""Draw what every used site holds when, as SVG panels that print.

In: a story.  Out: SVG elements as text, each with its own time axis: first the calls,
then the sites.  One path for each state keeps large plans small.  Hover and the link to
the map come from the same rows as data.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from markupsafe import escape

from placer.report.replay import CLEAN, DATA, HIGH, LENT, MOVING, VALUE

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.report.replay import Stretch
    from placer.report.story import Story

STATES = {
    DATA: "data",
    VALUE: "value",
    LENT: "lent",
    CLEAN: "clean",
    HIGH: "high",
    MOVING: "moving",
}
WIDTH = 960
_LEFT = 44
_RIGHT = 14
ROWS_A_PANEL = 32
_LETTER = 5.2  # width of a letter in a stretch, in units of the drawing
_MOST_LANES = 6
TOP = 16
_TALL, _GAP = 15, 4
ROW_PITCH = _TALL + _GAP


@dataclass(frozen=True, slots=True)
class Scale:
    """From ns to the units of the drawing."""

    end: int

    def x(self, time: float) -> float:
        """Return the place of a time."""
        return _LEFT + (WIDTH - _LEFT - _RIGHT) * time / max(self.end, 1)


def ticks(end: int, most: int = 9) -> list[int]:
    """Return round times from 0 up to an end, at most so many."""
    if end <= 0:
        return [0]
    power = 10 ** max(0, math.floor(math.log10(end / most)))
    steps = [factor * power for factor in (1, 2, 5, 10)]
    step = next(one for one in steps if end / one <= most)
    return list(range(0, end + 1, step))


def unit_of(end: int) -> tuple[str, int]:
    """Return the unit for a time axis and its length in ns."""
    for name, size in (("s", 10**9), ("ms", 10**6), ("us", 10**3)):
        if end >= 2 * size:
            return name, size
    return "ns", 1


def timelines(story: Story) -> list[str]:
    """Return the panels: the calls, then all used sites in order of their numbers."""
    scale = Scale(story.replay.end)
    by_site: dict[int, list[Stretch]] = {}
    for stretch in story.replay.stretches:
        by_site.setdefault(stretch.site, []).append(stretch)
    sites = sorted(by_site)
    panels = []
    if any(step.operation.is_call for step in story.steps):
        panels.append(_calls(story, scale))
    for first in range(0, len(sites), ROWS_A_PANEL):
        chosen = sites[first : first + ROWS_A_PANEL]
        panels.append(_panel(story, scale, chosen, by_site))
    return panels


def lanes(spans: Sequence[tuple[int, int]]) -> list[int]:
    """Return a lane per span, in order of start, so that none overlap; greedy."""
    ends: list[int] = []
    found = []
    for start, end in spans:
        lane = next((k for k, busy in enumerate(ends) if busy <= start), len(ends))
        ends[lane : lane + 1] = [end]
        found.append(lane)
    return found


def call_spans(story: Story) -> list[tuple[int, int, int]]:
    """Return (step, start, end) of all calls on the route, in order of start."""
    rows = [
        (step.operation.index, *story.when.get(step.operation.index, (0, 0)))
        for step in story.steps
        if step.operation.is_call
    ]
    return sorted(rows, key=lambda row: (row[1], row[0]))


def _calls(story: Story, scale: Scale) -> str:
    rows = call_spans(story)
    lane_of = lanes([(start, end) for _, start, end in rows])
    count = max(lane_of, default=0) + 1
    height = 17 if count <= _MOST_LANES else 9
    parts = []
    for (index, start, end), lane in zip(rows, lane_of, strict=True):
        x, width = scale.x(start), max(scale.x(end) - scale.x(start), 1.5)
        y = TOP + lane * (height + 2)
        op = story.program.operations[index]
        title = f"step {index}: {op.title}"
        label = ""
        if height > 10:
            words = _fitting((f"{op.name} {index}", str(index)), width)
            label = f'<text x="{_n(x + 3)}" y="{_n(y + 12)}">{escape(words)}</text>'
        parts.append(
            f'<a href="#call-{index}" data-call="{index}" '
            f'aria-label="{escape(title)}"><title>{escape(title)}</title>'
            f'<rect class="call" x="{_n(x)}" y="{_n(y)}" width="{_n(width)}" '
            f'height="{height}"/>{label}</a>'
        )
    bottom = TOP + count * (height + 2)
    return _svg(
        scale,
        bottom,
        f"{_axis(scale, bottom)}{''.join(parts)}",
        "calls",
        "When each call runs on the included route; the table of calls says the same",
    )


def _fitting(words: Sequence[str], width: float) -> str:
    """Return the first text that fits a width, or nothing."""
    return next((w for w in words if len(w) * _LETTER + 5 <= width), "")


def _panel(
    story: Story,
    scale: Scale,
    sites: Sequence[int],
    by_site: dict[int, list[Stretch]],
) -> str:
    shapes: dict[int, list[str]] = {state: [] for state in STATES}
    labels = []
    names = []
    for row, site in enumerate(sites):
        y = TOP + row * ROW_PITCH
        names.append(
            f'<text class="row" data-site="{site}" x="{_LEFT - 6}" y="{y + 11}">'
            f"${site}</text>"
        )
        for stretch in by_site[site]:
            x, end = scale.x(stretch.start), scale.x(stretch.end)
            width = max(end - x, 0.6)
            top, tall = (y + 5, 5) if stretch.state == CLEAN else (y, _TALL)
            shapes[stretch.state].append(
                f"M{_n(x)} {top}h{_n(width)}v{tall}h{_n(-width)}z"
            )
            if stretch.state in (DATA, VALUE, LENT, HIGH):
                words = _fitting(_words(story, stretch), width)
                if words:
                    labels.append(
                        f'<text class="on-{STATES[stretch.state]}" x="{_n(x + 3)}" '
                        f'y="{y + 11}">{escape(words)}</text>'
                    )
    bottom = TOP + len(sites) * ROW_PITCH
    paths = "".join(
        f'<path class="{STATES[state]}" d="{"".join(found)}"/>'
        for state, found in shapes.items()
        if found
    )
    label = (
        f"What sites {sites[0]} to {sites[-1]} hold over time; the table of sites "
        "names wires, leases and lenders"
    )
    inner = f"{_axis(scale, bottom)}{''.join(names)}{paths}{''.join(labels)}"
    return _svg(scale, bottom, inner, f"sites-{sites[0]}", label, sites)


def _words(story: Story, stretch: Stretch) -> tuple[str, ...]:
    """Return what to write into a stretch, the longest first."""
    name = story.names[stretch.holder]
    if stretch.holder >= len(story.program.wire_names):
        name = name.split(" of ")[0]
    if stretch.state == LENT:
        return (f"lent by {name}", f"lent {name}", "lent")
    if stretch.state == HIGH:
        return (f"2: {name}", "2")
    return (name,)


def _axis(scale: Scale, bottom: float) -> str:
    unit, size = unit_of(scale.end)
    parts = []
    times = ticks(scale.end)
    for time in times:
        x = scale.x(time)
        text = f"{time / size:g}" + (f" {unit}" if time == times[-1] else "")
        parts.append(
            f'<path class="tick" d="M{_n(x)} 12V{_n(bottom)}"/>'
            f'<text class="axis" x="{_n(x)}" y="9">{text}</text>'
        )
    return "".join(parts)


def _svg(
    scale: Scale,
    bottom: float,
    inner: str,
    name: str,
    label: str,
    sites: Sequence[int] = (),
) -> str:
    rows = f' data-sites="{" ".join(map(str, sites))}"' if sites else ""
    return (
        f'<svg id="time-{name}" class="timeline" role="img" '
        f'aria-label="{escape(label)}" viewBox="0 0 {WIDTH} {_n(bottom + 4)}" '
        f'data-left="{_LEFT}" data-right="{WIDTH - _RIGHT}" data-end="{scale.end}"'
        f"{rows}>{inner}"
        f'<path class="now" d="M0 12V{_n(bottom)}" visibility="hidden"/></svg>'
    )


def rows_of(story: Story) -> dict[str, Any]:
    """Return the stretches by site: flat rows of start, end, state and holder."""
    rows: dict[str, list[int]] = {}
    for stretch in sorted(story.replay.stretches):
        row = rows.setdefault(str(stretch.site), [])
        row += [stretch.start, stretch.end, stretch.state, stretch.holder]
    return {"rows": rows, "names": list(story.names), "states": list(STATES.values())}


def _n(value: float) -> str:
    """Return a length with one decimal at most."""
    return f"{value:.1f}".removesuffix(".0")
