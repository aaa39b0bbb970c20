"""Say quantities and paragraphs for a terminal: units, percents, tables, bars.

Plain text of a fixed width, the same every time.  Colour is added only when asked for,
and never carries meaning of its own.
"""

from __future__ import annotations

import io
import os
import shutil
import textwrap
from typing import TYPE_CHECKING, Any

from rich import box
from rich.console import Console
from rich.table import Table
from rich.text import Text

if TYPE_CHECKING:
    from collections.abc import Sequence

WIDTH = 80
NARROWEST = 40
WIDEST = 100
# A header, a rule of ASCII dashes, rows; nothing that a plain terminal cannot show.
_RULED = box.Box("    \n    \n -- \n    \n    \n    \n    \n    \n", ascii=True)
_GAP = 2
_SHADES = {"good": "bold green", "bad": "bold red", "title": "bold", "faint": "dim"}


class Page:
    """A text under construction, line by line, for one terminal width."""

    def __init__(self, width: int = WIDTH, *, colour: bool = False) -> None:
        self.width = max(width, NARROWEST)
        self._colour = colour
        self._out = io.StringIO()
        self._console = Console(
            file=self._out,
            width=self.width,
            color_system="standard" if colour else None,
            force_terminal=colour,
            highlight=False,
            markup=False,
            emoji=False,
            legacy_windows=False,
            _environ={},
        )

    def line(self, text: str = "", shade: str = "") -> None:
        """Add one line as it is; it may be cut by nothing but the terminal."""
        self._console.print(
            Text(plain(text), style=_SHADES.get(shade, "")),
            no_wrap=True,
            overflow="ignore",
            crop=False,
        )

    def paragraph(self, text: str, indent: int = 0, shade: str = "") -> None:
        """Add a text wrapped to the width, later lines indented by two more."""
        lead = " " * indent
        lines = textwrap.wrap(
            plain(text),
            self.width,
            initial_indent=lead,
            subsequent_indent=lead + "  " * bool(indent),
            break_on_hyphens=False,
        )
        for line in lines or [""]:
            self.line(line, shade)

    def heading(self, text: str) -> None:
        """Add an empty line and a heading."""
        self.line()
        self.paragraph(text, shade="title")

    def table(
        self,
        columns: Sequence[str],
        rows: Sequence[Sequence[str]],
        *,
        drop: Sequence[int] = (),
    ) -> None:
        """Add a table; all columns but the first are aligned to the right.

        A column whose title starts with `<` is aligned to the left.  `drop` lists
        the columns that a narrow terminal can do without, the first to go first.
        """
        cells = [[plain(cell) for cell in row] for row in rows]
        shown = self._fitting(
            [title.removeprefix("<") for title in columns], cells, drop
        )
        table = Table(
            box=_RULED, pad_edge=False, show_edge=False, padding=(0, _GAP - 1, 0, 0)
        )
        for number in shown:
            title = columns[number]
            is_left = number == 0 or title.startswith("<")
            table.add_column(
                Text(title.removeprefix("<")),
                justify="left" if is_left else "right",
                overflow="fold",
            )
        for row in cells:
            table.add_row(*(Text(row[number]) for number in shown))
        self._console.print(table)

    def _fitting(
        self, titles: Sequence[str], rows: Sequence[Sequence[str]], drop: Sequence[int]
    ) -> list[int]:
        widths = [
            max(len(row[i]) for row in (titles, *rows)) for i in range(len(titles))
        ]
        shown = list(range(len(titles)))
        for number in drop:
            if sum(widths[i] + _GAP for i in shown) - _GAP <= self.width:
                break
            shown.remove(number)
        return shown

    def text(self) -> str:
        """Return everything, without blanks at line ends."""
        whole = self._out.getvalue()
        return "\n".join(line.rstrip() for line in whole.splitlines()) + "\n"


def plain(text: str) -> str:
    """Return a text without control characters, so that no name steers a terminal."""
    return "".join(c if c.isprintable() else " " for c in text)


def duration(nanoseconds: float) -> str:
    """Return a time in the unit that people read: ns, us, ms or s."""
    for unit, size in (("s", 1e9), ("ms", 1e6), ("us", 1e3)):
        if nanoseconds >= size:
            return f"{significant(nanoseconds / size)} {unit}"
    return f"{significant(nanoseconds)} ns"


def percent(share: float) -> str:
    """Return a share of 1 in percent; what is not 0 or 1 is never shown as such."""
    value = 100 * share
    if share == 0 or value >= 1000:
        return f"{value:.0f} %"
    if 0 < share < 1 and value > 99:
        for digits in range(1, 12):
            text = f"{value:.{digits}f}"
            if not text.startswith("100"):
                return f"{text} %"
    if abs(value) < 1e-3:
        return f"{value:.1e} %"
    return f"{significant(value)} %"


def significant(value: float) -> str:
    """Return a number with three significant digits and no exponent."""
    if value == 0:
        return "0"
    if abs(value) >= 100:
        return f"{value:.0f}"
    for limit, digits in ((10, 1), (1, 2), (0.1, 3), (0.01, 4)):
        if abs(value) >= limit:
            text = f"{value:.{digits}f}"
            return text.rstrip("0").rstrip(".")
    return f"{value:.3g}"


def quantity(value: float, unit: str) -> str:
    """Return a figure in its unit, as the limits of a budget name it."""
    if unit == "ns":
        return duration(value)
    if unit in ("share", "probability", "success", ""):
        return percent(value)
    return f"{significant(value)} {unit}"


def bar(share: float, width: int) -> str:
    """Return a bar of `#` for a share of 1; what is not 0 has at least one."""
    if share <= 0:
        return ""
    return "#" * max(1, int(share * width + 0.5))


def count(number: int, singular: str, plural: str = "") -> str:
    """Return a number with its noun: `1 swap`, `3 swaps`."""
    return f"{number} {singular if number == 1 else plural or singular + 's'}"


def listed(words: Sequence[str], most: int = 8) -> str:
    """Return words with commas, cut after `most` with the number left out."""
    shown = ", ".join(words[:most])
    left = len(words) - most
    return f"{shown} and {left} more" if left > 0 else shown


def look(stream: Any) -> dict[str, Any]:
    """Return width and colour: what the terminal has, or fixed when there is none."""
    if not stream.isatty():
        return {"width": WIDTH, "colour": False}
    columns = shutil.get_terminal_size((WIDTH, 24)).columns
    return {"width": min(columns, WIDEST), "colour": "NO_COLOR" not in os.environ}
