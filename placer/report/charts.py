"""Draw charts as SVG text for a page: offline, repeatable, in the page's own colours.

In: plain rows.  Out: one SVG element each.  Axes, ticks and layout are those of the
charting library; its colours are taken out and replaced by the page's variables, so
that a chart follows light and dark.  Every chart has a table beside it that says the
same, so a screen reader gets its label only.
"""

from __future__ import annotations

import io
import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import matplotlib as mpl
from markupsafe import escape
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, MaxNLocator

from placer.report.palette import PALETTE

if TYPE_CHECKING:
    from collections.abc import Sequence

    from matplotlib.axes import Axes

WIDTH = 380
_INCH = 72  # one point of the drawing is one unit of the page
# Stand-ins for the page's colours, while the library draws: #0000nn for colour nn.
_STAND_IN = {name: f"#0000{number + 16:02x}" for number, name in enumerate(PALETTE)}
_STYLE: Any = {
    "svg.fonttype": "none",
    "svg.hashsalt": "placer",
    "font.size": 10,
    "font.family": "sans-serif",
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.linewidth": 0.8,
    "axes.edgecolor": _STAND_IN["faint"],
    "axes.labelcolor": _STAND_IN["ink"],
    "axes.titlesize": 10,
    "axes.grid": True,
    "axes.axisbelow": True,
    "grid.color": _STAND_IN["rule"],
    "grid.linewidth": 0.7,
    "xtick.color": _STAND_IN["faint"],
    "ytick.color": _STAND_IN["faint"],
    "xtick.labelcolor": _STAND_IN["ink"],
    "ytick.labelcolor": _STAND_IN["ink"],
    "text.color": _STAND_IN["ink"],
    "figure.facecolor": "none",
    "axes.facecolor": "none",
    "legend.frameon": False,
    "legend.fontsize": 9,
}


@dataclass(frozen=True, slots=True)
class Bars:
    """Stacked bars, one for each row: `parts` are (colour, value) from the left."""

    label: str
    parts: tuple[tuple[str, float], ...]


@dataclass(frozen=True, slots=True)
class Line:
    """A line with points; `dashed` for what is a bound; missing values are left out."""

    label: str
    colour: str
    x: tuple[float, ...]
    y: tuple[float, ...]
    dashed: bool = False
    is_step: bool = False


def bars(
    rows: Sequence[Bars],
    *,
    name: str,
    label: str,
    unit: str,
    words: dict[str, str],
    most: float | None = None,
) -> str:
    """Return horizontal stacked bars.

    `words` names the colours in the legend, `most` is where the axis ends, for charts
    that are to be compared.
    """
    shown = [c for c in words if any(v > 0 for r in rows for k, v in r.parts if k == c)]
    lines = -(-len(shown) // 3)
    with mpl.rc_context(_STYLE):
        figure, axes = _blank(46 + 24 * len(rows) + 15 * lines)
        ends = [0.0] * len(rows)
        for colour in shown:
            values = [dict(row.parts).get(colour, 0.0) for row in rows]
            axes.barh(
                range(len(rows)),
                values,
                left=ends,
                height=0.62,
                color=_STAND_IN[colour],
                edgecolor=_STAND_IN["sheet"],
                linewidth=0.6,
                label=words[colour],
            )
            ends = [a + b for a, b in zip(ends, values, strict=True)]
        axes.set_yticks(range(len(rows)), [row.label for row in rows])
        axes.tick_params(axis="y", length=0)
        axes.invert_yaxis()
        axes.grid(visible=False, axis="y")
        axes.set_xlabel(unit)
        if most:
            axes.set_xlim(0, 1.04 * most)
        _plain_ticks(axes, "x")
        if shown:
            figure.legend(
                loc="outside upper left", ncols=3, handlelength=1.2, columnspacing=1.2
            )
        return _text(figure, name, label)


def lines(
    rows: Sequence[Line],
    *,
    name: str,
    label: str,
    x_unit: str,
    y_unit: str,
    marked: tuple[float, float] | None = None,
    whole_x: bool = True,
) -> str:
    """Return lines over one axis; `marked` is the point that was chosen."""
    with mpl.rc_context(_STYLE):
        figure, axes = _blank(210)
        for row in rows:
            axes.plot(
                row.x,
                row.y,
                color=_STAND_IN[row.colour],
                linestyle="--" if row.dashed else "-",
                drawstyle="steps-post" if row.is_step else "default",
                marker="o" if not row.dashed else "s",
                markersize=4 if not row.dashed else 3,
                linewidth=1.6,
                label=row.label,
            )
        if marked is not None:
            axes.plot(
                *([value] for value in marked),
                marker="D",
                markersize=9,
                markerfacecolor="none",
                markeredgewidth=1.8,
                color=_STAND_IN["bad"],
                linestyle="none",
                label="this plan",
            )
        axes.set_xlabel(x_unit)
        axes.set_ylabel(y_unit)
        axes.margins(0.06, 0.1)
        if whole_x:
            axes.xaxis.set_major_locator(MaxNLocator(integer=True, nbins=8))
        _plain_ticks(axes, "y")
        if len(rows) + (marked is not None) > 1:
            figure.legend(loc="outside upper left", ncols=3, handlelength=1.8)
        return _text(figure, name, label)


def _blank(height: float) -> tuple[Figure, Axes]:
    figure = Figure(figsize=(WIDTH / _INCH, height / _INCH), layout="constrained")
    FigureCanvasSVG(figure)
    return figure, figure.add_subplot()


def _plain_ticks(axes: Axes, which: str) -> None:
    axis = axes.xaxis if which == "x" else axes.yaxis
    axis.set_major_locator(MaxNLocator(nbins=5))
    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))


def _text(figure: Figure, name: str, label: str) -> str:
    """Return a figure as an SVG element that fits into a page."""
    buffer = io.StringIO()
    figure.savefig(buffer, format="svg", metadata={"Date": None, "Creator": None})
    text = buffer.getvalue()
    text = text[text.index("<svg") :]
    text = re.sub(r"<metadata>.*?</metadata>", "", text, flags=re.DOTALL)
    text = re.sub(r"<!--.*?-->\s*", "", text, flags=re.DOTALL)
    # All charts stand in one page: ids get the chart's name.
    text = re.sub(r'\bid="', f'id="{name}-', text)
    text = re.sub(r"url\(#", f"url(#{name}-", text)
    text = re.sub(r'xlink:href="#', f'href="#{name}-', text)
    text = re.sub(r"\s*xmlns(:xlink)?=\"[^\"]*\"", "", text)
    for colour, stand_in in _STAND_IN.items():
        text = text.replace(stand_in, f"var(--{colour})")
    # The page's own font; and nothing in a chart may style the page.
    text = re.sub(r"font-family: [^;\"]*;?", "", text)
    text = re.sub(r"font: ([\d.]+)px [^;\"]*", r"font-size: \1px", text)
    text = re.sub(r"<style.*?</style>", "", text, flags=re.DOTALL)
    text = re.sub(r"\s+", " ", re.sub(r"(\.\d\d)\d+", r"\1", text))
    box = re.search(r'viewBox="[^"]*"', text)
    frame = box.group(0) if box is not None else ""
    head = f'<svg class="chart" role="img" aria-label="{escape(label)}" {frame}>'
    return (head + text[text.index(">") + 1 :]).strip()
