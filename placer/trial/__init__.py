"""The trial route and its timeline: swaps, idle times, success.

In: a placed circuit and the tables of its device.  Out: a route, and what it costs.
"""

from placer.trial.router import RouteResult, Setting, from_route, route
from placer.trial.timeline import Timeline, figures, timeline, wait_cost

__all__ = [
    "RouteResult",
    "Setting",
    "Timeline",
    "figures",
    "from_route",
    "route",
    "timeline",
    "wait_cost",
]
