"""One row of a comparison: what the best plan of a program on a device gives.

In: a plan, or the reason why there is none.  Out: plain data that is written and read
again as one line of JSON.
"""

from __future__ import annotations

import dataclasses
import hashlib
import json
from collections import Counter
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

from placer.errors import InputError
from placer.plan import Costs, Figures
from placer.version import VERSION

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from placer.device.model import Budget, Device
    from placer.errors import PlacerError
    from placer.plan import Plan
    from placer.program.model import Program

State = Literal["fits", "does not fit", "cannot run"]
CAUSES = {
    "two_qubit": "two-qubit gates",
    "one_qubit": "one-qubit gates",
    "swaps": "swaps",
    "decay": "waiting",
    "measurement": "measurement",
    "level2": "level-2 gates",
    "preparation": "preparation",
}
_KINDS = ("clean", "borrowed", "level2", "none")
_WORDS = {"level2": "level 2", "none": "no workspace"}


@dataclass(frozen=True, slots=True)
class Options:
    """What is asked of every pair; a `None` leaves a device's own budget."""

    share: float | None = None
    least_success: float | None = None
    most_sites: int | None = None
    longest_ns: int | None = None
    only: tuple[str, ...] = ()
    effort: Literal["quick", "normal", "deep"] = "normal"
    seed: int = 0
    open_inputs: bool = False

    def budget_on(self, device: Device) -> Budget:
        """Return the budget for a device."""
        given = {
            name: getattr(self, name)
            for name in ("share", "least_success", "most_sites", "longest_ns")
            if getattr(self, name) is not None
        }
        return dataclasses.replace(device.budget, **given)


@dataclass(frozen=True, slots=True)
class Row:
    """A program on a device.

    `key` names the question: the texts of both, the options, the version.  `choice`
    says which workspace the plan's calls use, `cause` what limits it: the limit that
    is missed most, or the largest cause of error.  `reason` is why it cannot run.
    """

    key: str
    program: str
    device: str
    state: State
    choice: str
    cause: str
    reason: str
    nearest: str
    calibrated: str
    sites: int
    gap: float | None
    figures: Figures | None

    @property
    def fits(self) -> bool:
        """Whether a plan was found that keeps every limit."""
        return self.state == "fits"


def key_of(program: Program, device: Device, options: Options) -> str:
    """Return the name of a question: the same content, the same name."""
    parts = (
        VERSION,
        program.name,
        program.hash,
        device.name,
        device.hash,
        repr(options),
    )
    return hashlib.sha256("\0".join(parts).encode()).hexdigest()


def row_of(
    program: Program, device: Device, options: Options, found: Plan | PlacerError
) -> Row:
    """Return the row of a plan, or of the reason why there is none."""
    in_service = sum(1 for site in device.sites if site.in_service)
    key = key_of(program, device, options)
    if isinstance(found, Exception):
        return Row(
            key,
            program.name,
            device.name,
            "cannot run",
            "",
            "",
            _reason(found),
            "",
            device.calibrated,
            in_service,
            None,
            None,
        )
    return Row(
        key=key,
        program=program.name,
        device=device.name,
        state="fits" if found.verdict.fits else "does not fit",
        choice=_choice(found),
        cause=_cause(found),
        reason="",
        nearest=found.verdict.nearest,
        calibrated=found.calibrated,
        sites=in_service,
        gap=found.bound.gap,
        figures=found.figures,
    )


def _reason(error: PlacerError) -> str:
    if isinstance(error, InputError):
        return "; ".join(fault.what for fault in error.faults)
    return " ".join(str(error).split())


def _choice(plan: Plan) -> str:
    """Return how many calls use which workspace: `clean 3, borrowed 1`."""
    counts = Counter(call.workspace for call in plan.calls)
    found = [f"{_WORDS.get(k, k)} {counts[k]}" for k in _KINDS if counts[k]]
    return ", ".join(found) or "no calls"


def _cause(plan: Plan) -> str:
    broken = [limit for limit in plan.verdict.limits if not limit.holds]
    if broken:
        return ", ".join(limit.name for limit in broken)
    costs = plan.figures.costs
    most = max(CAUSES, key=lambda name: int(getattr(costs, name)))
    return CAUSES[most] if getattr(costs, most) else "nothing"


def ranked(rows: Iterable[Row]) -> dict[str, tuple[Row, ...]]:
    """Return the rows of each program, the best device first.

    A plan that fits goes before one that does not, that before none at all; then the
    higher success, the shorter time, the name.
    """
    groups: dict[str, list[Row]] = {}
    for row in rows:
        groups.setdefault(row.program, []).append(row)
    return {name: tuple(sorted(group, key=_rank)) for name, group in groups.items()}


def _rank(row: Row) -> tuple[int, int, int, str]:
    place = ("fits", "does not fit", "cannot run").index(row.state)
    if row.figures is None:
        return (place, 0, 0, row.device)
    return (place, row.figures.costs.total, row.figures.time_ns, row.device)


def fits_somewhere(rows: Sequence[Row]) -> bool:
    """Whether every program has a device that it fits on."""
    programs = {row.program for row in rows}
    return programs == {row.program for row in rows if row.fits}


def to_line(row: Row) -> str:
    """Return a row as one line of JSON."""
    return json.dumps(dataclasses.asdict(row), ensure_ascii=False) + "\n"


def of_line(text: str) -> Row:
    """Return the row of one line of JSON.

    Raises
    ------
    ValueError
        If it is none.
    """
    return of_data(json.loads(text))


def of_data(data: Mapping[str, Any]) -> Row:
    """Return a row from plain data.

    Raises
    ------
    ValueError
        If it is none.
    """
    try:
        figures = data["figures"]
        if figures is not None:
            figures = Figures(**{**figures, "costs": Costs(**figures["costs"])})
        row = Row(**{**data, "figures": figures})
    except (TypeError, KeyError) as error:
        raise ValueError(f"this is no row of a comparison ({error})") from error
    if row.state not in ("fits", "does not fit", "cannot run"):
        raise ValueError(f"this is no row of a comparison (state '{row.state}')")
    return row
