"""A device as frozen data: sites, links, capabilities.  No reading, no formulas."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NewType

SiteId = NewType("SiteId", int)


@dataclass(frozen=True, slots=True)
class Level2:
    """The third state of a site: lifetime of 2 -> 1 in us, one-qutrit error, time."""

    t1_us: float
    error: float
    time_ns: int


@dataclass(frozen=True, slots=True)
class Site:
    """One physical qubit.

    Lifetimes in microseconds, `None` where no decay is known; errors are plain
    probabilities; times in whole nanoseconds.  `prep_error` is the excited population
    of a fresh |0> (0 where not given).  `xy` places the site on a drawing.
    """

    id: SiteId
    t1_us: float | None
    t2_us: float | None
    gate_error: float
    gate_ns: int
    readout_error: float
    readout_ns: int
    reset_error: float
    reset_ns: int
    prep_error: float
    level2: Level2 | None
    in_service: bool
    xy: tuple[float, float]


@dataclass(frozen=True, slots=True)
class Link:
    """A pair of sites with a two-qubit gate, a < b.

    `level2_error` and `level2_ns` describe the two-qutrit gate; both `None` where the
    link has none.  The same figures hold in both directions.
    """

    a: SiteId
    b: SiteId
    error: float
    time_ns: int
    level2_error: float | None
    level2_ns: int | None


@dataclass(frozen=True, slots=True)
class Capabilities:
    """What the control system can do.

    `conditional_ns` is the latency between the end of a measurement and the start of
    a gate that depends on it; `None` means there are no conditional gates.
    """

    mid_circuit_measurement: bool
    conditional_ns: int | None
    reset: bool

    @property
    def measured_cleanup(self) -> bool:
        """Whether values may be cleaned up by measurement and a phase fix."""
        return self.mid_circuit_measurement and self.conditional_ns is not None


@dataclass(frozen=True, slots=True)
class TGate:
    """Price of a T gate where it is not an ordinary one-qubit gate."""

    error: float
    time_ns: int


@dataclass(frozen=True, slots=True)
class Budget:
    """What a program may spend; `None` means no limit.

    `share` is the largest part of min(T1, T2) that one value may live.
    """

    share: float = 0.5
    least_success: float | None = None
    most_sites: int | None = None
    longest_ns: int | None = None


@dataclass(frozen=True, slots=True)
class Device:
    """A device as read from its file.

    `sites[i].id == i`; `links` is sorted by (a, b); links to sites out of service are
    kept and marked by their sites.  `text` is the exact source, `hash` its sha256.
    """

    name: str
    note: str
    calibrated: str
    lattice: str
    sites: tuple[Site, ...]
    links: tuple[Link, ...]
    capabilities: Capabilities
    t_gate: TGate | None
    budget: Budget
    text: str
    path: str
    hash: str
    link_at: dict[tuple[int, int], Link] = field(repr=False, compare=False)

    def link(self, a: int, b: int) -> Link | None:
        """Return the link between two sites in either order, or `None`."""
        return self.link_at.get((a, b) if a < b else (b, a))

    def is_usable(self, link: Link) -> bool:
        """Whether both ends of a link are in service."""
        return self.sites[link.a].in_service and self.sites[link.b].in_service
