"""Hold a plan's figures against the budget, and say the result in one sentence."""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.plan import Limit, Verdict
from placer.units import decimal_down, decimal_up

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Budget
    from placer.plan import Figures


def limits_of(figures: Figures, budget: Budget) -> tuple[Limit, ...]:
    """Return every limit of the budget with the plan's value, in a fixed order."""
    rows = [
        Limit(
            "share of lifetime",
            figures.worst_share,
            budget.share,
            figures.worst_share <= budget.share,
            "share",
            figures.worst_value,
        )
    ]
    least = budget.least_success
    rows.append(
        Limit(
            "success",
            figures.success,
            least,
            least is None or figures.success >= least,
            "probability",
        )
    )
    most = budget.most_sites
    rows.append(
        Limit(
            "sites",
            float(figures.sites),
            None if most is None else float(most),
            most is None or figures.sites <= most,
            "sites",
        )
    )
    longest = budget.longest_ns
    rows.append(
        Limit(
            "run time",
            float(figures.time_ns),
            None if longest is None else float(longest),
            longest is None or figures.time_ns <= longest,
            "ns",
        )
    )
    return tuple(rows)


def overrun(figures: Figures, budget: Budget) -> float:
    """Return by what factor the worst limit is missed; 0 if all are kept."""
    worst = 0.0
    for limit in limits_of(figures, budget):
        if limit.holds or limit.limit is None:
            continue
        if limit.unit == "probability":
            # Compare expected errors; a success of 0 is infinitely far from any limit.
            worst = max(worst, 1.0 + limit.limit - limit.value)
        else:
            worst = max(worst, limit.value / max(limit.limit, 1e-12))
    return worst


def verdict_of(figures: Figures, budget: Budget, nearest: str = "") -> Verdict:
    """Return the verdict with its sentence."""
    limits = limits_of(figures, budget)
    broken = [limit for limit in limits if not limit.holds]
    if not broken:
        return Verdict(True, f"fits: {_margin(limits)}", limits)
    text = "; ".join(_miss(limit) for limit in broken)
    return Verdict(False, f"does not fit: {text}", limits, nearest)


def _margin(limits: tuple[Limit, ...]) -> str:
    share = limits[0]
    success = limits[1].value
    parts = []
    if share.about:
        parts.append(
            f"the longest-lived value ({share.about}) lives {share.value:.0%} of its "
            f"lifetime, {share.limit:.0%} allowed"
        )
    else:
        parts.append("no value waits in workspace")
    needed = limits[1].limit
    if needed is None:
        parts.append(f"estimated success {success:.3g}")
    else:
        parts.append(f"estimated success {success:.3g}, {needed:.3g} needed")
    return "; ".join(parts)


def _miss(limit: Limit) -> str:
    wanted = 0.0 if limit.limit is None else limit.limit
    if limit.unit == "share":
        return (
            f"{limit.about} lives {limit.value:.0%} of its lifetime, "
            f"{limit.value / wanted:.2g} times the {wanted:.0%} allowed"
        )
    if limit.unit == "probability":
        return f"estimated success {limit.value:.3g}, {wanted:.3g} needed"
    if limit.unit == "ns":
        return f"runs {limit.value / 1e3:.4g} us, {wanted / 1e3:.4g} us allowed"
    return f"uses {limit.value:.0f} sites, {wanted:.0f} allowed"


def nearest_change(seen: Sequence[Figures], budget: Budget) -> str:
    """Return the smallest change of one limit under which a seen plan would fit.

    `seen` are figures of real plans of the same problem; nothing is extrapolated.
    """
    offers: list[tuple[float, str]] = []
    for figures in seen:
        broken = [limit for limit in limits_of(figures, budget) if not limit.holds]
        if len(broken) != 1:
            continue
        limit = broken[0]
        wanted = 0.0 if limit.limit is None else limit.limit
        if limit.unit == "probability":
            factor = (1.0 - limit.value) / max(1.0 - wanted, 1e-12)
            lower = _down(limit.value)
            offers.append((factor, f"a plan fits with --least-success {lower}"))
        elif limit.unit == "share":
            upper = _up(limit.value)
            offers.append((limit.value / max(wanted, 1e-12), _share(upper)))
        elif limit.unit == "sites":
            text = f"a plan fits with --most-sites {limit.value:.0f}"
            offers.append((limit.value / max(wanted, 1e-12), text))
        else:
            text = f"a plan fits when {limit.value / 1e3:.4g} us are allowed"
            offers.append((limit.value / max(wanted, 1e-12), text))
    if offers:
        return min(offers)[1]
    return "no single limit can be loosened alone; several are missed at once"


def _share(upper: str) -> str:
    if float(upper) > 1.0:
        return (
            "a plan fits only if values may outlive their lifetime "
            f"(--budget {upper}); take a device with longer T1 and T2"
        )
    return f"a plan fits with --budget {upper}"


def _up(value: float) -> str:
    return f"{decimal_up(value, 3):g}"


def _down(value: float) -> str:
    return f"{decimal_down(value, 4):g}"
