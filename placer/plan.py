"""The answer: recipes, sites, leases, schedule, route, figures, verdict; JSON in, out.

No algorithms.  All times are whole nanoseconds, all costs are -ln(fidelity) in units
of 1e-12, all intervals are half-open.  What each figure means is defined in
DEVELOPERS.md, 'How a plan is judged'.
"""

from __future__ import annotations

import dataclasses
import hashlib
import html
import json
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

from placer.device.model import Budget
from placer.errors import InputError, Place
from placer.program.model import CALL_KINDS

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

FORMAT = 1
Policy = Literal["clean", "borrowed", "level2", "none"]
POLICIES: tuple[Policy, ...] = ("clean", "borrowed", "level2", "none")


@dataclass(frozen=True, slots=True)
class Lease:
    """A slot's stay on a site over [start, end).

    `lender` is the name of the idle wire whose site a borrowed slot uses; `None` for
    clean slots and for a borrowed slot on a site that nothing else holds.
    """

    slot: int
    site: int
    kind: Literal["clean", "borrowed"]
    start: int
    end: int
    lender: str | None


@dataclass(frozen=True, slots=True)
class Step:
    """One operation of the program with its recipe and its planned time.

    `lost` lists the other recipes that were considered, each with the reason.
    """

    index: int
    kind: str
    name: str
    line: int
    recipe: str
    workspace: str
    start: int
    end: int
    leases: tuple[Lease, ...]
    lost: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Route:
    """The included route: which swaps happen between which two-body gates.

    Two-body gates are numbered in placed order.  `gaps[i]` holds runs (first, last),
    both included, of the gates done before swap `i`; the last gap follows the last
    swap.  `expected_swaps` is the mean over `held_out` routes with settings and seeds
    that the search never used (-1 when none was run).
    """

    gaps: tuple[tuple[tuple[int, int], ...], ...]
    swaps: tuple[tuple[int, int], ...]
    held_out: int = 0
    expected_swaps: float = -1.0


@dataclass(frozen=True, slots=True)
class Costs:
    """Where the expected error comes from; whole numbers, see the module text."""

    two_qubit: int = 0
    one_qubit: int = 0
    swaps: int = 0
    decay: int = 0
    measurement: int = 0
    level2: int = 0
    preparation: int = 0

    @property
    def total(self) -> int:
        """The sum of all causes."""
        return (
            self.two_qubit
            + self.one_qubit
            + self.swaps
            + self.decay
            + self.measurement
            + self.level2
            + self.preparation
        )


@dataclass(frozen=True, slots=True)
class Figures:
    """What the included route does on the device; estimates, not promises.

    `worst_share` is the largest part of min(T1, T2) that one value lives (for a stay
    in level 2: of that level's lifetime), `worst_value` names it.
    """

    sites: int
    swaps: int
    time_ns: int
    two_qubit_gates: int
    one_qubit_gates: int
    t_gates: int
    measurements: int
    level2_gates: int
    costs: Costs
    success: float
    worst_share: float
    worst_value: str


@dataclass(frozen=True, slots=True)
class Bound:
    """How good the plan is.

    `estimate` is the plan's placement cost, `least` a proven lower bound of the
    placement cost over all plans of the problem, `by` says who proved it.  `proven`
    is true when the two are equal.  `floor` bounds the expected error (figures) of
    every plan from below, `floor_by` says how.
    """

    estimate: int
    least: int | None
    by: str
    proven: bool
    floor: int
    floor_by: str

    @property
    def gap(self) -> float | None:
        """(estimate - least) / estimate, `None` without a bound."""
        if self.least is None:
            return None
        return (self.estimate - self.least) / self.estimate if self.estimate else 0.0


@dataclass(frozen=True, slots=True)
class PolicyRow:
    """What one fixed workspace choice applied everywhere would give."""

    policy: str
    possible: bool
    reason: str
    fits: bool
    figures: Figures | None
    estimate: int | None


@dataclass(frozen=True, slots=True)
class ValueRow:
    """What became of one value of the program.

    `size` is the number of wires that hold it, `computed` how often it is computed in
    the plan, `dropped` how often it is measured away.  `treatment` is `once` (computed
    and cleaned up once), `again` (cleaned up and computed again) or `measured`.
    `why` says it in words.  `next_best` is the expected error, in units of a plan's
    costs, of the best other order that was planned and treats this value differently;
    `None` where there is none.
    """

    name: str
    line: int
    size: int
    computed: int
    dropped: int
    treatment: str
    why: str
    next_best: int | None


@dataclass(frozen=True, slots=True)
class OrderRow:
    """One order of computing and cleaning up that was planned on the device.

    `name` is `as written`, `at once`, `at end`, or `within N wires`; `wires` the
    most workspace wires that hold values at a time, `computed` the number of times
    that values are computed.  `effort` is the work that its figures rest on.
    """

    name: str
    wires: int
    computed: int
    possible: bool
    reason: str
    fits: bool
    figures: Figures | None
    estimate: int | None
    effort: str


@dataclass(frozen=True, slots=True)
class CurvePoint:
    """The least cost of computing and cleaning up within a number of wires.

    `cost` and `bound` are in units of a plan's costs, before anything is placed: gates
    of the cheapest recipes and waiting at nominal figures.  `cost` is `None` where no
    order exists (or none was found: then `proven` is false).
    """

    wires: int
    cost: int | None
    bound: int | None
    proven: bool
    by: str


@dataclass(frozen=True, slots=True)
class Cleanup:
    """When values are computed and cleaned up.

    `asked` is what was asked for, `chosen` the name of the row that the plan follows.
    `moves` are (`compute`, `uncompute`, `drop` or `use`, number of the value or the
    use); empty where the program's own order is kept.  `crossing` says in words from
    which number of sites on another order is best.
    """

    asked: str
    chosen: str
    moves: tuple[tuple[str, int], ...]
    values: tuple[ValueRow, ...]
    rows: tuple[OrderRow, ...]
    curve: tuple[CurvePoint, ...]
    crossing: str


@dataclass(frozen=True, slots=True)
class TradeRow:
    """What planning again under one change gave; nothing is extrapolated.

    `name` is the change in a few words, `how` says it exactly.  `limit` is the most
    sites allowed, `None` where the change is another one.
    """

    name: str
    how: str
    limit: int | None
    possible: bool
    reason: str
    fits: bool
    figures: Figures | None


@dataclass(frozen=True, slots=True)
class Trade:
    """What more or less workspace, and a better device, would bring.

    All rows are planned with the same `effort`, so that they compare with each other.
    `curve` has rising limits on the sites; the first of `changes` is the question as
    it is.
    """

    effort: str
    curve: tuple[TradeRow, ...]
    changes: tuple[TradeRow, ...]


@dataclass(frozen=True, slots=True)
class Conflict:
    """One limit of a conflict, and what a plan without it needs.

    `name` is the limit (`share of lifetime`, `success`, `sites`, `run time`, `kinds of
    workspace`), `words` how the user set it, `without` what was found when it was left
    out and the others of the set were kept.
    """

    name: str
    words: str
    without: str
    figures: Figures | None


@dataclass(frozen=True, slots=True)
class Nearest:
    """A change under which a plan was found that fits."""

    words: str
    figures: Figures
    effort: str


@dataclass(frozen=True, slots=True)
class WhyNot:
    """The smallest set of limits that no plan was found to keep together.

    `proven` is true when no plan can keep them, `by` says how that is known.
    """

    sentence: str
    limits: tuple[Conflict, ...]
    proven: bool
    by: str
    nearest: tuple[Nearest, ...]
    effort: str


@dataclass(frozen=True, slots=True)
class Limit:
    """One limit of the budget against what the plan does, both in the unit named."""

    name: str
    value: float
    limit: float | None
    holds: bool
    unit: str
    about: str = ""


@dataclass(frozen=True, slots=True)
class Verdict:
    """Does it fit, in one sentence, with every limit and what limits most."""

    fits: bool
    sentence: str
    limits: tuple[Limit, ...]
    nearest: str = ""


@dataclass(frozen=True, slots=True)
class Source:
    """An input as it was read: its whole text travels with the plan."""

    name: str
    path: str
    syntax: str
    hash: str
    text: str


@dataclass(frozen=True, slots=True)
class Plan:
    """A checked answer for one program on one device."""

    version: str
    program: Source
    device: Source
    calibrated: str
    open_inputs: bool
    assumed: str
    budget: Budget
    goal: str
    only: tuple[str, ...]
    seed: int
    effort: str
    wires: Mapping[str, int]
    steps: tuple[Step, ...]
    route: Route
    figures: Figures
    bound: Bound
    policies: tuple[PolicyRow, ...]
    verdict: Verdict
    notes: tuple[str, ...] = ()
    cleanup: Cleanup | None = None
    trade: Trade | None = None
    whynot: WhyNot | None = None

    @property
    def calls(self) -> tuple[Step, ...]:
        """The steps that recipes competed for."""
        return tuple(s for s in self.steps if s.kind in CALL_KINDS)

    @property
    def hash(self) -> str:
        """The sha256 of the plan's JSON text."""
        return hashlib.sha256(to_json(self).encode()).hexdigest()

    def _repr_html_(self) -> str:
        """Return what a notebook shows: the verdict, the map, the timeline."""
        return _pictures[-1](self)


# A plan knows nothing of reports: who draws it is said from outside.
_pictures: list[Callable[[Plan], str]] = [
    lambda plan: f"<pre>{html.escape(plan.verdict.sentence)}</pre>"
]


def show_with(picture: Callable[[Plan], str]) -> None:
    """Let notebooks show plans with a drawing of theirs."""
    _pictures[:] = [picture]


def to_json(plan: Plan) -> str:
    """Return the plan as JSON text, keys in a fixed order, ending in a newline."""
    data = dataclasses.asdict(plan)
    data["wires"] = dict(plan.wires)
    figures = data["figures"]
    figures["cost"] = plan.figures.costs.total
    for section in ("cleanup", "trade", "whynot"):
        if data[section] is None:
            del data[section]
    bound = data["bound"]
    bound["gap"] = plan.bound.gap
    steps = data.pop("steps")
    calls = [s for s in steps if s["kind"] in CALL_KINDS]
    others = [
        [s["index"], s["start"], s["end"]] for s in steps if s["kind"] not in CALL_KINDS
    ]
    head = {"format": FORMAT, **data}
    head["calls"] = calls
    head["others"] = others
    return json.dumps(head, indent=1, ensure_ascii=False) + "\n"


def from_json(text: str, path: str = "plan") -> dict[str, Any]:
    """Return the raw data of a plan file, without believing any of it.

    Raises
    ------
    InputError
        If the text is not a JSON object of this format.
    """
    place = Place(path)
    try:
        data = json.loads(text)
    except (ValueError, RecursionError) as error:
        line = getattr(error, "lineno", 0)
        raise InputError.at(
            Place(path, line),
            "not-json",
            f"this is not JSON ({error})",
            "give the file that 'placer plan --plan FILE' wrote",
        ) from error
    if not isinstance(data, dict) or data.get("format") != FORMAT:
        raise InputError.at(
            place,
            "not-a-plan",
            f"this is not a plan of format {FORMAT}",
            "give the file that 'placer plan --plan FILE' wrote",
        )
    return data
