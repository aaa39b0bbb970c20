"""Sites and links put together from defaults and overrides.

Comes after the reading of single numbers; finds the faults that only show when the
figures are merged.  Every site or link that cannot be built has left a fault.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from placer.device.figures import SITE_LEVEL2, Figures, check_lifetimes
from placer.device.lattices import Lattice, Pair, parts
from placer.device.model import Level2, Link, Site, SiteId
from placer.errors import Fault, Place
from placer.units import ticks_up
from placer.yamltext import Faults

_SHOWN = 8  # sites that a message lists


@dataclass(frozen=True, slots=True)
class Stated:
    """What a device file states about its sites and links, before merging.

    `level2_sites` is `None` where the file does not say which sites offer level 2.
    """

    site_default: Figures
    link_default: Figures
    of_site: Mapping[int, Figures]
    of_link: Mapping[Pair, Figures]
    level2_sites: tuple[int, ...] | None
    level2_place: Place
    out_of_order: tuple[int, ...]
    graph_place: Place


def build_sites(faults: Faults, lattice: Lattice, stated: Stated) -> tuple[Site, ...]:
    """Return the sites in order; with faults some may be missing."""
    offered = set(stated.level2_sites or ())
    closed = set(stated.out_of_order)
    _check_level2(faults, lattice, stated)
    sites = []
    for number in range(lattice.count):
        own = stated.of_site.get(number, {})
        figures = {**stated.site_default, **own}
        if "t1_us" in own or "t2_us" in own:
            blamed = "t2_us" if "t2_us" in own else "t1_us"
            check_lifetimes(faults, figures, f"site {number}", blamed=blamed)
        site = _site(
            number,
            figures,
            has_level2=number in offered,
            in_service=number not in closed,
            xy=lattice.xy[number],
        )
        if site is not None:
            sites.append(site)
    return tuple(sites)


def _site(
    number: int,
    figures: Figures,
    *,
    has_level2: bool,
    in_service: bool,
    xy: tuple[float, float],
) -> Site | None:
    lifetimes = [figures[key].value for key in ("t1_us", "t2_us") if key in figures]
    gate = _operation(figures, "gate_error", "gate_time_ns")
    readout = _operation(figures, "readout_error", "readout_time_ns")
    if len(lifetimes) < 2 or gate is None or readout is None:
        return None
    # Without the capability there is no reset, and its figures stand for nothing.
    reset = _operation(figures, "reset_error", "reset_time_ns") or (0.0, 0)
    level2 = None
    if has_level2:
        lifetime = figures.get("level2.t1_us")
        action = _operation(figures, "level2.error", "level2.time_ns")
        if lifetime is None or lifetime.value is None or action is None:
            return None
        level2 = Level2(lifetime.value, *action)
    prep = figures["prep_error"].value if "prep_error" in figures else 0.0
    return Site(
        id=SiteId(number),
        t1_us=lifetimes[0],
        t2_us=lifetimes[1],
        gate_error=gate[0],
        gate_ns=gate[1],
        readout_error=readout[0],
        readout_ns=readout[1],
        reset_error=reset[0],
        reset_ns=reset[1],
        prep_error=prep or 0.0,
        level2=level2,
        in_service=in_service,
        xy=xy,
    )


def build_links(faults: Faults, lattice: Lattice, stated: Stated) -> tuple[Link, ...]:
    """Return the links in order; with faults some may be missing.

    A two-qutrit gate is offered where at least one end has level 2.
    """
    offered = set(stated.level2_sites or ())
    links = []
    for a, b in lattice.links:
        figures = {**stated.link_default, **stated.of_link.get((a, b), {})}
        gate = _operation(figures, "error", "time_ns")
        action = None
        if a in offered or b in offered:
            action = _operation(figures, "level2.error", "level2.time_ns")
            _check_half(faults, figures, f"{a}-{b}")
        if gate is not None:
            error, time = action if action is not None else (None, None)
            links.append(Link(SiteId(a), SiteId(b), *gate, error, time))
    if offered and not any(link.level2_error is not None for link in links):
        faults.append(
            Fault(
                stated.level2_place,
                "no-level2-gate",
                "sites offer level 2 but no link has a two-qutrit gate",
                "give links.level2 with error and time_ns, or write level2_sites: none",
            )
        )
    return tuple(links)


def check_connected(faults: Faults, lattice: Lattice, stated: Stated) -> None:
    """Refuse sites in service that no chain of links joins."""
    closed = set(stated.out_of_order)
    open_sites = [site for site in range(lattice.count) if site not in closed]
    found = parts(open_sites, lattice.links)
    if not found:
        faults.append(
            Fault(stated.graph_place, "no-site", "no site of the device is in service")
        )
    elif len(found) > 1:
        smallest = min(found, key=len)
        faults.append(
            Fault(
                stated.graph_place,
                "disconnected",
                f"the sites in service fall into {len(found)} parts; the smallest is"
                f" {_sites_words(smallest)}",
                "add links, put sites back into service, or write"
                " allow_disconnected: true",
            )
        )


def _operation(figures: Figures, error: str, time: str) -> tuple[float, int] | None:
    """Return error and duration in ns of an operation, if both are known."""
    if error not in figures or time not in figures:
        return None
    probability, duration = figures[error].value, figures[time].value
    if probability is None or duration is None:
        return None
    return probability, ticks_up(duration)


def _check_half(faults: Faults, figures: Figures, link: str) -> None:
    """Refuse a two-qutrit gate with an error but no time, or the other way round."""
    given = [key for key in ("level2.error", "level2.time_ns") if key in figures]
    if len(given) == 1:
        missing = "time_ns" if given[0] == "level2.error" else "error"
        faults.append(
            Fault(
                figures[given[0]].place,
                "missing-key",
                f"the two-qutrit gate of link {link} has no {missing}",
                "give both error and time_ns under level2",
            )
        )


def _check_level2(faults: Faults, lattice: Lattice, stated: Stated) -> None:
    """Compare which sites offer level 2 with what is known about their level 2."""
    if stated.level2_sites is None:
        everything = [
            stated.site_default,
            stated.link_default,
            *stated.of_site.values(),
            *stated.of_link.values(),
        ]
        for figures in everything:
            stray = _level2_figure_places(figures)[:1]
            if stray:
                faults.append(
                    Fault(
                        stray[0],
                        "level2-not-offered",
                        "level-2 figures, but the file does not say which sites offer"
                        " level 2",
                        "write level2_sites: all, none or a list under capabilities",
                    )
                )
                return
        return
    if not stated.level2_sites:
        return  # written as none: level 2 is switched off, its figures may stay
    offered = set(stated.level2_sites)
    for site, figures in sorted(stated.of_site.items()):
        if site not in offered:
            faults.extend(
                Fault(
                    place,
                    "level2-not-offered",
                    f"level-2 figures of site {site}, which is not in level2_sites",
                    "add the site to level2_sites or drop the figures",
                )
                for place in _level2_figure_places(figures)[:1]
            )
    for name in SITE_LEVEL2:
        key = f"level2.{name}"
        lacking = [
            site
            for site in range(lattice.count)
            if site in offered and _is_lacking(stated, site, key)
        ]
        if lacking:
            what = "lifetime, t1_us" if name == "t1_us" else name
            faults.append(
                Fault(
                    stated.level2_place,
                    "missing-level2",
                    f"level 2 of {_sites_words(lacking)} has no {what}",
                    f"give {name} under sites.level2",
                )
            )


def _is_lacking(stated: Stated, site: int, key: str) -> bool:
    """Whether a figure is not given, or given as none; a bad one left its own fault."""
    figure = stated.of_site.get(site, {}).get(key) or stated.site_default.get(key)
    return figure is None or (figure.is_good and figure.value is None)


def _level2_figure_places(figures: Figures) -> list[Place]:
    return [figures[key].place for key in sorted(figures) if key.startswith("level2.")]


def _sites_words(sites: Sequence[int]) -> str:
    if len(sites) == 1:
        return f"site {sites[0]}"
    words = ", ".join(str(site) for site in sites[:_SHOWN])
    more = len(sites) - _SHOWN
    return f"sites {words}" + (f" and {more} more" if more > 0 else "")
