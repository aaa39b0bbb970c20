"""What a report tells of a plan: its sources read again, its route followed again.

In: the data of a plan file that has passed its check.  Out: program, device, every
event of the included route, and the expected error by cause, step, site and link.
Whatever a report shows is here or in the plan's data.
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, NamedTuple

from placer.device.read import read_device
from placer.placed import LEVEL2, MEASURE, RESET, TWO, place
from placer.plan import Route
from placer.problem import Problem
from placer.program.planned import planned_program
from placer.program.read import read_program
from placer.report.qasm import placed_steps
from placer.report.replay import replay_route
from placer.tables import device_tables
from placer.trial.router import from_route
from placer.trial.timeline import timeline

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from placer.device.model import Device
    from placer.placed import PlacedCircuit
    from placer.program.model import Program
    from placer.report.qasm import PlacedStep
    from placer.report.replay import Replay

Pair = tuple[int, int]
CAUSES = (
    "two_qubit",
    "one_qubit",
    "swaps",
    "decay",
    "measurement",
    "level2",
    "preparation",
)


@dataclass(frozen=True, slots=True)
class Part:
    """A part of the expected error, in units of a plan's costs."""

    gates: int
    swaps: int
    waiting: int

    @property
    def total(self) -> int:
        """The sum of the three."""
        return self.gates + self.swaps + self.waiting


@dataclass(frozen=True, slots=True)
class Life:
    """The part of its lifetime that one value lives, or one stay in level 2."""

    name: str
    share: float


class Fresh(NamedTuple):
    """A site that is prepared in |0> for a slot, or for a wire's first use."""

    step: int
    site: int
    cost: int


@dataclass(frozen=True, slots=True)
class Story:
    """Everything that a report is made from.

    `of_step` splits the error by step (`NO_STEP`: what belongs to none, such as waits
    up to the end), `of_site` by site (operations of one site, waits), `of_link` by
    link (two-body gates, swaps); the first sums up to the plan's expected error, so do
    the last two together.  `when` is start and end of each step on the route.  `names`
    are those of the holders: wires first, then slots without a lender.
    """

    data: Mapping[str, Any]
    program: Program
    device: Device
    steps: tuple[PlacedStep, ...]
    replay: Replay
    names: tuple[str, ...]
    fresh: tuple[Fresh, ...]
    of_step: Mapping[int, Part]
    of_site: Mapping[int, Part]
    of_link: Mapping[Pair, Part]
    when: Mapping[int, Pair]
    lives: tuple[Life, ...]

    @property
    def total(self) -> int:
        """The expected error of the plan."""
        return sum(part.total for part in self.of_step.values())


def read_story(data: Mapping[str, Any]) -> Story:
    """Return the story of a plan whose data has been checked.

    Raises
    ------
    InternalError
        If the route cannot be followed, which a checked plan's can.
    """
    source, hardware = data["program"], data["device"]
    device = read_device(hardware["text"], hardware["path"])
    written = read_program(
        source["text"], source["path"], open_inputs=data["open_inputs"]
    )
    moves = (data.get("cleanup") or {}).get("moves", ())
    program = planned_program(written, moves, device)
    steps = placed_steps(data, program)
    placed = _placed(data, program, device, steps)
    tables = device_tables(device)
    route = from_route(
        Route(
            tuple(tuple((a, b) for a, b in runs) for runs in data["route"]["gaps"]),
            tuple((a, b) for a, b in data["route"]["swaps"]),
        ),
        placed,
    )
    line = timeline(placed, tables, route)
    replay = replay_route(
        placed,
        tables,
        route,
        is_workspace=[
            program.register_at(w).workspace for w in range(len(program.wire_names))
        ],
        lent_until=_lent_until(steps),
    )
    names = _names(program, placed)
    fresh = _fresh(placed, steps, program, tables.prep.tolist())
    shares = line.share.tolist()
    stays = line.stay.tolist()
    lives = [Life(names[h], share) for h, share in enumerate(shares) if share > 0]
    lives += [Life(f"{names[h]} in level 2", s) for h, s in enumerate(stays) if s > 0]
    return Story(
        data=data,
        program=program,
        device=device,
        steps=steps,
        replay=replay,
        names=names,
        fresh=fresh,
        of_step=_by_step(replay, fresh),
        of_site=_by_site(replay, fresh),
        of_link=_by_link(replay),
        when=_when(replay),
        lives=tuple(sorted(lives, key=lambda life: (-life.share, life.name))),
    )


def _placed(
    data: Mapping[str, Any],
    program: Program,
    device: Device,
    steps: Sequence[PlacedStep],
) -> PlacedCircuit:
    wire_of = {name: wire for wire, name in enumerate(program.wire_names)}
    by_index = {step.operation.index: step for step in steps}
    rows = [by_index[index] for index in range(len(program.operations))]
    problem = Problem(device, program, device.budget, "error", (), (), "")
    return place(
        problem,
        [data["wires"][name] for name in program.wire_names],
        [step.built for step in rows],
        [[lease.site for lease in step.leases] for step in rows],
        [step.operation.index for step in steps],
        [
            [None if x.lender is None else wire_of[x.lender] for x in step.leases]
            for step in rows
        ],
    )


def _lent_until(steps: Sequence[PlacedStep]) -> list[int]:
    """Return per entry the last entry of the lent slot that it acts for, or -1."""
    slots: list[tuple[int, int] | None] = []
    for step in steps:
        count = len(step.operation.wires)
        lent = {count + x.slot for x in step.leases if x.lender is not None}
        index = step.operation.index
        for op in step.built.fine.ops:
            slots += [(index, wire) if wire in lent else None for wire in op.wires]
    last = {key: entry for entry, key in enumerate(slots) if key is not None}
    return [-1 if key is None else last[key] for key in slots]


def _names(program: Program, placed: PlacedCircuit) -> tuple[str, ...]:
    names = list(program.wire_names)
    for step, slot in placed.leases:
        op = program.operations[step]
        at = f" at line {op.place.line}" if op.place.line else ""
        names.append(f"slot {slot} of '{op.name}'{at}")
    return tuple(names)


def _fresh(
    placed: PlacedCircuit,
    steps: Sequence[PlacedStep],
    program: Program,
    prep: Sequence[int],
) -> tuple[Fresh, ...]:
    """Return every preparation that is charged."""
    rows = []
    first: dict[int, int] = {}
    for step in steps:
        index = step.operation.index
        rows += [Fresh(index, x.site, prep[x.site]) for x in step.leases if x.is_clean]
        for wire in step.operation.wires:
            first.setdefault(wire, index)
    home = placed.home.tolist()
    for at, index in sorted(first.items()):
        if program.register_at(at).start == "zero":
            rows.append(Fresh(index, home[at], prep[home[at]]))
    return tuple(rows)


class _Sums:
    """Costs by key and by sort: 0 gates, 1 swaps, 2 waiting."""

    def __init__(self) -> None:
        self.rows: defaultdict[Any, list[int]] = defaultdict(lambda: [0, 0, 0])

    def add(self, key: Any, sort: int, cost: int) -> None:
        self.rows[key][sort] += cost

    def parts(self) -> dict[Any, Part]:
        return {key: Part(*row) for key, row in sorted(self.rows.items())}


def _by_step(replay: Replay, fresh: Sequence[Fresh]) -> dict[int, Part]:
    sums = _Sums()
    for act in replay.acts:
        sums.add(act.step, 0, act.cost)
    for one in fresh:
        sums.add(one.step, 0, one.cost)
    for swap in replay.swaps:
        sums.add(swap.step, 1, swap.cost)
    for wait in replay.waits:
        sums.add(wait.step, 2, wait.cost)
    return sums.parts()


def _by_site(replay: Replay, fresh: Sequence[Fresh]) -> dict[int, Part]:
    sums = _Sums()
    for act in replay.acts:
        if act.code < TWO and act.cost:
            sums.add(act.sites[0], 0, act.cost)
    for one in fresh:
        if one.cost:
            sums.add(one.site, 0, one.cost)
    for wait in replay.waits:
        sums.add(wait.site, 2, wait.cost)
    return sums.parts()


def _by_link(replay: Replay) -> dict[Pair, Part]:
    sums = _Sums()
    for act in replay.acts:
        if act.code in (TWO, LEVEL2):
            one, two = sorted(act.sites)
            sums.add((one, two), 0, act.cost)
    for swap in replay.swaps:
        sums.add((min(swap.a, swap.b), max(swap.a, swap.b)), 1, swap.cost)
    return sums.parts()


def _when(replay: Replay) -> dict[int, Pair]:
    """Return from when to when each step has operations."""
    found: dict[int, Pair] = {}
    for act in replay.acts:
        start, end = found.get(act.step, (act.start, act.end))
        found[act.step] = (min(start, act.start), max(end, act.end))
    return found


def of_cause(story: Story) -> dict[str, int]:
    """Return the expected error by cause, added up from the events."""
    causes = dict.fromkeys(CAUSES, 0)
    names = {TWO: "two_qubit", LEVEL2: "level2", MEASURE: "measurement"}
    names[RESET] = "preparation"
    for act in story.replay.acts:
        causes[names.get(act.code, "one_qubit")] += act.cost
    causes["swaps"] = sum(swap.cost for swap in story.replay.swaps)
    causes["decay"] = sum(wait.cost for wait in story.replay.waits)
    causes["preparation"] += sum(one.cost for one in story.fresh)
    return causes
