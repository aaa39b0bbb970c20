"""Compare the stated figures with those of the walk along the route."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from placer.check.case import Case
    from placer.check.follow import Walk

CLOSE = 1e-9  # sums of a few thousand shares, in another order
COUNTS = (
    "two_qubit_gates",
    "one_qubit_gates",
    "t_gates",
    "measurements",
    "level2_gates",
)


def check_figures(case: Case, walk: Walk) -> None:
    """Apply the rules of the figures; the route itself is sound."""
    _check_made(case, walk)
    _check_share(case, walk)
    stated = case.data["figures"]
    success = success_of_costs(stated["costs"])
    if not is_close(stated["success"], success):
        text = f"{stated['success']} is stated, exp(-expected error) is {success}"
        case.find("success-misstated", "figures", text)


def success_of_costs(costs: dict[str, int]) -> float:
    """Return exp(-total)."""
    return math.exp(-sum(costs.values()) / 1e12)


def is_close(one: float, two: float) -> bool:
    """Whether two figures agree but for the order of a sum."""
    return math.isclose(one, two, rel_tol=CLOSE, abs_tol=1e-300)


def _check_made(case: Case, walk: Walk) -> None:
    """Counts, time and costs.

    Each wait is rounded up to whole 1e-12 on its own, and exp may differ in its last
    bit between machines: decay may differ by one unit per wait.
    """
    stated = case.data["figures"]
    made: dict[str, Any] = {name: walk.counts.get(name, 0) for name in COUNTS}
    made["sites"] = len(walk.touched)
    made["swaps"] = len(case.data["route"]["swaps"])
    made["time_ns"] = walk.last
    made["cost"] = sum(stated["costs"].values())
    rows = [(name, stated[name], value, 0) for name, value in made.items()]
    for cause, value in walk.costs.items():
        slack = walk.charges if cause == "decay" else 0
        rows.append((f"costs/{cause}", stated["costs"][cause], value, slack))
    for name, found, value, slack in rows:
        if abs(found - value) > slack:
            text = f"{found} is stated, the route gives {value}"
            case.find("figures-misstated", name, text)


def _check_share(case: Case, walk: Walk) -> None:
    """The largest share, and who has it: of (nearly) equal ones any may be named."""
    rows = [(share, walk.names[h]) for h, share in walk.shares.items()]
    rows += [(share, f"{walk.names[h]} in level 2") for h, share in walk.stays.items()]
    worst = max((share for share, _ in rows), default=0.0)
    names = sorted({name for share, name in rows if is_close(share, worst)})
    if worst == 0.0:
        names = ["", *names]
    stated = case.data["figures"]
    share, name = stated["worst_share"], stated["worst_value"]
    if not is_close(share, worst) or name not in names:
        text = f"{share} of '{name}' is stated, the route gives {worst} of {names}"
        case.find("share-misstated", "figures", text)
