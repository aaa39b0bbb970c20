"""Exact conversion to integer nanoseconds and to integer cost.

The only place that rounds.  Durations and costs round up, budgets round down, so that
rounding never makes a bad plan look good.  A cost is -ln(fidelity) in units of 1e-12.
"""

from __future__ import annotations

import math
from typing import NewType

Tick = NewType("Tick", int)
"""A time or a duration in nanoseconds."""

Cost = NewType("Cost", int)
"""-ln(fidelity) in units of 1e-12."""

COST_PER_NAT = 10**12
# Differences below this many nanoseconds or cost units are noise of the decimal
# input (0.1 us * 1000), not a reason to round to the next integer.
_NOISE = 1e-6


def ticks_up(nanoseconds: float) -> Tick:
    """Return a duration in whole nanoseconds, rounded up."""
    return Tick(math.ceil(nanoseconds - _NOISE))


def ticks_down(nanoseconds: float) -> Tick:
    """Return a limit in whole nanoseconds, rounded down."""
    return Tick(math.floor(nanoseconds + _NOISE))


def cost_of_fidelity(fidelity: float) -> Cost:
    """Return -ln(fidelity) as an integer cost, rounded up.

    Raises
    ------
    ValueError
        If the fidelity is not in (0, 1].
    """
    if not 0.0 < fidelity <= 1.0:
        raise ValueError(f"fidelity {fidelity} is not in (0, 1]")
    return Cost(math.ceil(-math.log(fidelity) * COST_PER_NAT - _NOISE))


def cost_of_error(error: float) -> Cost:
    """Return -ln(1 - error) as an integer cost, rounded up; error in [0, 1)."""
    if not 0.0 <= error < 1.0:
        raise ValueError(f"error {error} is not in [0, 1)")
    return Cost(math.ceil(-math.log1p(-error) * COST_PER_NAT - _NOISE))


def rate_per_tick(slope_per_us: float) -> int:
    """Return a decay slope (1/us, of -ln F at t = 0) as cost per nanosecond, up."""
    return math.ceil(slope_per_us * 1e-3 * COST_PER_NAT - _NOISE)


def success_of(cost: int) -> float:
    """Return exp(-cost), the success estimate that people see."""
    return math.exp(-cost / COST_PER_NAT)


def nats(cost: int) -> float:
    """Return a cost as a plain number of nats."""
    return cost / COST_PER_NAT


def decimal_up(value: float, places: int) -> float:
    """Return the least decimal of so many places that is no less than a value."""
    return math.ceil(value * 10.0**places) / 10.0**places


def decimal_down(value: float, places: int) -> float:
    """Return the largest decimal of so many places that is no more than a value."""
    return math.floor(value * 10.0**places) / 10.0**places
