"""Numbers of a report that say where they come from.

In: a raw value, a path, a way to write it.  Out: a `data` element whose text is what
people read.  The path leads into the plan's JSON (`figures/costs/swaps`), or names what
is derived from it (`by/step/7/swaps`), so that a test can find every number again.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from markupsafe import Markup

from placer.report.words import duration, percent, significant
from placer.units import nats

if TYPE_CHECKING:
    from collections.abc import Mapping


def written(value: float, way: str) -> str:
    """Return a number as people read it.

    `way` is `count`, `number`, `duration` (ns), `percent` (of 1), `error` (what is
    missing to 1, in percent), `nats` (a cost), `microseconds` or `signed` (nats).
    """
    if way == "count":
        return f"{value:.0f}"
    if way == "number":
        return significant(value)
    if way == "duration":
        return duration(value)
    if way == "percent":
        return percent(value)
    if way == "error":
        return percent(1 - value)
    if way == "nats":
        return significant(nats(int(value)))
    if way == "signed":
        return f"{'+' if value >= 0 else '−'}{significant(nats(abs(int(value))))}"
    if way == "microseconds":
        return f"{significant(value)} us"
    raise ValueError(f"there is no way '{way}' to write a number")


def fact(value: float | None, path: str, way: str) -> Markup:
    """Return a number with its path; a dash where there is none."""
    if value is None:
        return Markup('<span class="none" title="none">–</span>')
    return Markup('<data value="{}" data-from="{}" data-as="{}">{}</data>').format(
        value, path, way, written(value, way)
    )


def part(value: int, whole: int, path: str, whole_path: str) -> Markup:
    """Return which part of a whole a cost is, in percent."""
    share = value / whole if whole else 0.0
    return Markup(
        '<data value="{}" data-from="{}" data-of="{}" data-as="percent">{}</data>'
    ).format(share, path, whole_path, percent(share))


def ratio(value: float, whole: float, path: str, whole_path: str, way: str) -> Markup:
    """Return a ratio of two figures, as `percent` or as `times`.

    A path whose last name begins with `-` stands for 1 minus what is there.
    """
    shown = percent(value / whole) if way == "percent" else significant(value / whole)
    return Markup(
        '<data value="{}" data-from="{}" data-of="{}" data-as="{}">{}</data>'
    ).format(value / whole, path, whole_path, way, shown)


class Facts:
    """Looks numbers up in a plan's data by their path."""

    def __init__(self, data: Mapping[str, Any]) -> None:
        self.data = data

    def value(self, path: str) -> Any:
        """Return what stands at a path such as `policies/0/figures/swaps`."""
        found: Any = self.data
        for key in path.split("/"):
            found = found[int(key)] if isinstance(found, list) else found[key]
        return found

    def __call__(self, path: str, way: str) -> Markup:
        """Return the number at a path."""
        return fact(self.value(path), path, way)
