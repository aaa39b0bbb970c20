"""Figures of sites and links as they stand in a device file, each with its place.

Turns a mapping such as `{t1_us: 80, gate_error: 3e-4}` into checked numbers.  Defaults
and overrides are merged here; what a complete site needs is decided by the reader.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from placer.errors import Fault, Place
from placer.units import Tick, ticks_up
from placer.yamltext import Faults, Node

Sort = Literal["lifetime", "error", "time"]

LONGEST_US = 1e12  # twelve days; more is a slip of the unit
SHORTEST_US = 1e-3  # one nanosecond, the clock of all schedules

SITE_FIGURES: dict[str, Sort] = {
    "t1_us": "lifetime",
    "t2_us": "lifetime",
    "gate_error": "error",
    "gate_time_ns": "time",
    "readout_error": "error",
    "readout_time_ns": "time",
    "reset_error": "error",
    "reset_time_ns": "time",
    "prep_error": "error",
}
SITE_LEVEL2: dict[str, Sort] = {
    "t1_us": "lifetime",
    "error": "error",
    "time_ns": "time",
}
LINK_FIGURES: dict[str, Sort] = {"error": "error", "time_ns": "time"}
LINK_LEVEL2: dict[str, Sort] = {"error": "error", "time_ns": "time"}
T_GATE_FIGURES: dict[str, Sort] = {"error": "error", "time_ns": "time"}


@dataclass(frozen=True, slots=True)
class Figure:
    """One number and where it stands.

    `value` is `None` for a lifetime without known decay, and for a figure that left a
    fault, which is not `is_good`.
    """

    value: float | None
    place: Place
    is_good: bool = True


Figures = Mapping[str, Figure]
"""Figures by key; those of level 2 are called `level2.t1_us` and so on."""


def read_figures(
    faults: Faults,
    node: Node,
    *,
    plain: Mapping[str, Sort],
    level2: Mapping[str, Sort] | None = None,
    required: tuple[str, ...] = (),
) -> dict[str, Figure]:
    """Return the figures of one mapping, with faults for those that are not good."""
    keys = [*plain, "level2"] if level2 else [*plain]
    fields = node.mapping(faults, keys=keys, required=required) or {}
    found: dict[str, Figure] = {}
    for key, value in fields.items():
        if key == "level2" and level2 is not None:
            inner = value.mapping(faults, keys=[*level2]) or {}
            for name, entry in inner.items():
                found[f"level2.{name}"] = _figure(faults, entry, level2[name])
        else:
            found[key] = _figure(faults, value, plain[key])
    return found


def _figure(faults: Faults, node: Node, sort: Sort) -> Figure:
    if sort == "lifetime":
        if node.is_scalar and node.value == "none":
            return Figure(None, node.place)
        value = node.number(faults, low=SHORTEST_US, high=LONGEST_US)
    elif sort == "error":
        value = node.number(faults, low=0.0, below=1.0)
    else:
        value = node.number(faults, above=0.0, high=LONGEST_US)
    return Figure(value, node.place, is_good=value is not None)


def read_time(faults: Faults, node: Node) -> Tick | None:
    """Return a time in ns that may be zero, such as a latency."""
    value = node.number(faults, low=0.0, high=LONGEST_US)
    return None if value is None else ticks_up(value)


def check_lifetimes(
    faults: Faults, figures: Figures, who: str, *, blamed: str = "t2_us"
) -> None:
    """Refuse T2 > 2 T1, which no noise allows; `blamed` is the figure pointed at."""
    pair = [figures[key] for key in ("t1_us", "t2_us") if key in figures]
    if len(pair) < 2 or not all(figure.is_good for figure in pair):
        return
    t1, t2 = (figure.value for figure in pair)
    if t1 is None or (t2 is not None and t2 <= 2.0 * t1):
        return
    shown = "none (no decay)" if t2 is None else f"{t2:g}"
    faults.append(
        Fault(
            figures[blamed].place,
            "impossible-lifetime",
            f"T2 of {who} is {shown}, more than twice its T1 of {t1:g} us",
            f"decay of the excited state alone limits T2 to {2.0 * t1:g} us",
        )
    )
