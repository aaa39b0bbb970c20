"""Draw a device as SVG: sites at their lattice places, and what a plan does there.

In: a story.  Out: one SVG element as text.  Two maps: `roles` shows lifetimes, link
errors, wires, leases and lenders; `errors` shows where the expected error arises.
Everything drawn carries a title, and the tables beside the maps say the same.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from markupsafe import escape

from placer.report.words import percent, significant

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Device, Site
    from placer.report.story import Story

# Room for one site in units of the drawing, by number of sites.
_PITCH = ((40, 58.0), (160, 40.0), (600, 27.0))
_SMALLEST_PITCH = 19.0
_LEVELS = 4
_DENSE = 3  # more links per site than this are drawn faintly
_READABLE = 700.0  # least width of a map on a narrow screen, which then scrolls
_ENLARGED = 1.5
MOST_NAMED = 40  # sites; beyond that, names of wires stand in the table only


@dataclass(slots=True)
class Roles:
    """What a plan does with each site, by names."""

    wires: dict[int, list[str]] = field(default_factory=dict)
    leases: dict[int, int] = field(default_factory=dict)
    lent: dict[int, int] = field(default_factory=dict)
    touched: set[int] = field(default_factory=set)


def roles_of(story: Story) -> Roles:
    """Return which sites hold wires at first, are leased, are lent, or are passed."""
    roles = Roles()
    used = {wire for step in story.steps for wire in step.operation.wires}
    for wire, name in enumerate(story.program.wire_names):
        if wire in used or story.program.register_at(wire).start == "unknown":
            roles.wires.setdefault(story.data["wires"][name], []).append(name)
    for step in story.steps:
        for lease in step.leases:
            rows = roles.leases if lease.lender is None else roles.lent
            rows[lease.site] = rows.get(lease.site, 0) + 1
    for act in story.replay.acts:
        roles.touched.update(act.sites)
    for swap in story.replay.swaps:
        roles.touched.update((swap.a, swap.b))
    return roles


def lifetime_us(site: Site) -> float | None:
    """Return min(T1, T2) of a site in us, `None` where no decay is known."""
    return min((t for t in (site.t1_us, site.t2_us) if t is not None), default=None)


def classes(values: Sequence[float], most: int = _LEVELS) -> list[float]:
    """Return upper ends of up to `most` classes with about as many values in each."""
    ranked = sorted(set(values))
    if len(ranked) <= most:
        return ranked
    ranked = sorted(values)
    ends = [ranked[(k * len(ranked) + most - 1) // most - 1] for k in range(1, most)]
    return sorted({*ends, ranked[-1]})


def class_of(value: float, ends: Sequence[float]) -> int:
    """Return the shade of a value, from 1 up to `_LEVELS`."""
    place = next((k for k, end in enumerate(ends) if value <= end), len(ends) - 1)
    return shade_of(place, len(ends))


def shade_of(place: int, count: int) -> int:
    """Return the shade of a class among so many, spread over all shades."""
    return 2 if count == 1 else 1 + round(place * (_LEVELS - 1) / (count - 1))


@dataclass(slots=True)
class _Canvas:
    device: Device
    pitch: float
    spots: list[tuple[float, float]]
    width: float
    height: float
    parts: list[str] = field(default_factory=list)

    @property
    def radius(self) -> float:
        return self.pitch * 0.27


def _canvas(device: Device) -> _Canvas:
    count = len(device.sites)
    pitch = next((p for most, p in _PITCH if count <= most), _SMALLEST_PITCH)
    xs = [site.xy[0] for site in device.sites]
    ys = [site.xy[1] for site in device.sites]
    unit = pitch / _nearest([site.xy for site in device.sites])
    left, top = min(xs), min(ys)
    edge = pitch * 0.62
    spots = [(edge + (x - left) * unit, edge + (y - top) * unit) for x, y in
             zip(xs, ys, strict=True)]  # fmt: skip
    return _Canvas(
        device,
        pitch,
        spots,
        2 * edge + (max(xs) - left) * unit,
        2 * edge + (max(ys) - top) * unit,
    )


def _nearest(spots: Sequence[tuple[float, float]]) -> float:
    """Return the least distance of two sites, found along rows sorted by place."""
    ranked = sorted(spots)
    best = math.inf
    for place, (x, y) in enumerate(ranked):
        for other_x, other_y in ranked[place + 1 :]:
            if other_x - x >= best:
                break
            distance = math.hypot(other_x - x, other_y - y)
            if distance > 0:
                best = min(best, distance)
    return best if math.isfinite(best) else 1.0


def role_map(story: Story) -> str:
    """Return the map of lifetimes, link errors, wires, leases and lenders."""
    canvas = _canvas(story.device)
    roles = roles_of(story)
    ends = link_ends(story.device)
    used = {pair for pair, part in story.of_link.items() if part.total}
    dense = len(story.device.links) > _DENSE * len(story.device.sites)
    for link in story.device.links:
        usable = story.device.is_usable(link)
        name = f"link {link.a}–{link.b}: error {percent(link.error)}"
        level = class_of(link.error, ends) if usable else 0
        names = ["l", f"l{level}" if usable else "off"]
        if (link.a, link.b) in used:
            names.append("used")
        elif dense:
            names.append("thin")
        _line(canvas, link.a, link.b, " ".join(names), name, None)
    life_ends = site_ends(story.device)
    for site in story.device.sites:
        _role_site(canvas, site, roles, life_ends)
    label = (
        f"Map of {story.device.name}: sites by lifetime, links by error, and where "
        "wires, workspace and lenders sit; the table of sites says the same"
    )
    return _svg(canvas, "map-roles", label)


def link_ends(device: Device) -> list[float]:
    """Return the classes of link errors."""
    return classes([k.error for k in device.links if device.is_usable(k)])


def site_ends(device: Device) -> list[float]:
    """Return the classes of lifetimes in us."""
    lives = [lifetime_us(site) for site in device.sites if site.in_service]
    return classes([life for life in lives if life is not None])


def _role_site(
    canvas: _Canvas, site: Site, roles: Roles, ends: Sequence[float]
) -> None:
    x, y = canvas.spots[site.id]
    r = canvas.radius
    life = lifetime_us(site)
    inside = [f"site {site.id}"]
    rings = []
    if not site.in_service:
        inside.append("out of order")
        fill = "off"
    else:
        fill = f"s{class_of(life, ends)}" if life is not None else "s4"
        inside.append(
            "no decay known" if life is None else f"lifetime {significant(life)} us"
        )
    if site.level2 is not None:
        inside.append("offers level 2")
    if site.id in roles.wires:
        rings.append("data")
        inside.append("starts with " + ", ".join(roles.wires[site.id]))
    if site.id in roles.leases:
        rings.append("value")
        inside.append(f"leased {roles.leases[site.id]} times")
    if site.id in roles.lent:
        rings.append("lent")
        inside.append(f"lent {roles.lent[site.id]} times")
    if site.id in roles.touched and not rings:
        rings.append("passed")
        inside.append("passed by swaps")
    shapes = [f'<circle class="{fill}" r="{_n(r)}"/>']
    for place, ring in enumerate(rings):
        shapes.append(f'<circle class="ring {ring}" r="{_n(r + 2.5 + 3.5 * place)}"/>')
    if site.level2 is not None:
        shapes.append(f'<path class="two" d="M{_n(-r)} {_n(r)}h{_n(2 * r)}"/>')
    if not site.in_service:
        shapes.append(
            f'<path class="cross" d="M{_n(-r)} {_n(-r)}L{_n(r)} {_n(r)}'
            f'M{_n(r)} {_n(-r)}L{_n(-r)} {_n(r)}"/>'
        )
    shapes.append(_number(canvas, site.id))
    if site.id in roles.wires and len(canvas.spots) <= MOST_NAMED:
        names = _short("/".join(roles.wires[site.id]))
        shapes.append(
            f'<text class="wire" y="{_n(canvas.pitch * 0.53)}">{escape(names)}</text>'
        )
    canvas.parts.append(
        f'<g data-site="{site.id}" transform="translate({_n(x)} {_n(y)})">'
        f"<title>{escape('; '.join(inside))}</title>{''.join(shapes)}</g>"
    )


def _number(canvas: _Canvas, site: int) -> str:
    size = canvas.pitch * (0.24 if site < 100 else 0.2)
    return (
        f'<text class="no" y="{_n(size * 0.36)}" font-size="{_n(size)}">{site}</text>'
    )


def _short(name: str, most: int = 10) -> str:
    return name if len(name) <= most else f"{name[: most - 1]}…"


def error_map(story: Story) -> str:
    """Return the map of where the expected error arises: areas and widths by share."""
    canvas = _canvas(story.device)
    total = story.total or 1
    most_link = max((p.total for p in story.of_link.values()), default=0) or 1
    most_site = max((p.total for p in story.of_site.values()), default=0) or 1
    for link in story.device.links:
        part = story.of_link.get((link.a, link.b))
        if part is None or not part.total:
            _line(canvas, link.a, link.b, "l thin", "", None)
            continue
        name = f"link {link.a}–{link.b}: {percent(part.total / total)} of the error"
        width = max(1.0, canvas.radius * math.sqrt(part.total / most_link))
        _line(canvas, link.a, link.b, "l err", name, width)
    for site in story.device.sites:
        x, y = canvas.spots[site.id]
        part = story.of_site.get(site.id)
        cost = part.total if part is not None else 0
        name = f"site {site.id}: {percent(cost / total)} of the error"
        r = canvas.radius
        shapes = (
            f'<circle class="{"empty" if site.in_service else "off"}" r="{_n(r)}"/>'
        )
        if cost:
            size = 1.0 + (r * 1.35 - 1.0) * math.sqrt(cost / most_site)
            shapes += f'<circle class="load" r="{_n(size)}"/>'
        canvas.parts.append(
            f'<g data-site="{site.id}" transform="translate({_n(x)} {_n(y)})">'
            f"<title>{escape(name)}</title>{shapes}{_number(canvas, site.id)}</g>"
        )
    label = (
        f"Map of {story.device.name}: where the expected error arises; the tables of "
        "sites and links say the same"
    )
    return _svg(canvas, "map-errors", label)


def _line(
    canvas: _Canvas, a: int, b: int, names: str, title: str, width: float | None
) -> None:
    (x, y), (u, v) = canvas.spots[a], canvas.spots[b]
    style = "" if width is None else f' style="stroke-width:{_n(width)}"'
    inner = f"<title>{escape(title)}</title>" if title else ""
    canvas.parts.append(
        f'<path class="{names}" d="M{_n(x)} {_n(y)}L{_n(u)} {_n(v)}"{style}>'
        f"{inner}</path>"
    )


def _svg(canvas: _Canvas, name: str, label: str) -> str:
    least = min(canvas.width, _READABLE)
    wide = canvas.width * (_ENLARGED if len(canvas.spots) <= MOST_NAMED else 1.0)
    return (
        f'<svg id="{name}" class="map" role="img" aria-label="{escape(label)}" '
        f'viewBox="0 0 {_n(canvas.width)} {_n(canvas.height)}" '
        f'style="--wide:{_n(wide)}px;--least:{_n(least)}px">'
        f"{''.join(canvas.parts)}</svg>"
    )


def _n(value: float) -> str:
    """Return a length with one decimal at most."""
    return f"{value:.1f}".removesuffix(".0")
