"""A plan file turned into what the rules look at, without believing any of it.

In: the data of the JSON text.  Out: a `Case` with program and device read again from
the texts in the plan, or findings that say why there is none.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, NamedTuple

from placer.check.cleanup import follow_moves
from placer.check.numbers import Numbers
from placer.check.shape import faults_of
from placer.device.read import read_device
from placer.errors import InputError
from placer.problem import as_written
from placer.program.read import read_program
from placer.program.values import values_of
from placer.recipes import catalog, library

if TYPE_CHECKING:
    from collections.abc import Callable

    from placer.device.model import Device
    from placer.program.model import Operation, Program
    from placer.program.values import ValueGraph
    from placer.recipes.circuit import Built

    Build = Callable[[str, str, int, float, bool], Built]

Row = dict[str, Any]


class Finding(NamedTuple):
    """One broken rule: which, where, and what was found against what should be."""

    rule: str
    where: str
    what: str


class Lease(NamedTuple):
    """A lease as the plan states it."""

    slot: int
    site: int
    kind: str
    start: int
    end: int
    lender: str | None


@dataclass(slots=True)
class Planned:
    """One step as the plan states it, with its recipe built again.

    `where` are the sites of the recipe's local wires: operands, then slots.
    """

    op: Operation
    built: Built
    start: int
    end: int
    leases: tuple[Lease, ...]
    where: list[int]

    @property
    def label(self) -> str:
        """Name the step for people."""
        line = f" at line {self.op.place.line}" if self.op.place.line else ""
        return f"step {self.op.index} ('{self.op.name}'{line})"


@dataclass(slots=True)
class Case:
    """Everything the rules look at; `steps` in the order of the program.

    `graph` holds the values of the program where the plan speaks of them.
    """

    data: Row
    program: Program
    device: Device
    numbers: Numbers
    sites: list[int] = field(default_factory=list)
    steps: list[Planned] = field(default_factory=list)
    uses: dict[int, list[Planned]] = field(default_factory=dict)
    findings: list[Finding] = field(default_factory=list)
    graph: ValueGraph | None = None

    @property
    def end(self) -> int:
        """The planned end of the program: the largest end of all steps."""
        return max((step.end for step in self.steps), default=0)

    def find(self, rule: str, where: str, what: str) -> None:
        """Record a broken rule."""
        self.findings.append(Finding(rule, where, what))

    def order(self) -> list[Planned]:
        """Return the steps in placed order."""
        return sorted(self.steps, key=lambda s: (s.start, s.op.index))


def open_case(data: Row, build: Build = catalog.build) -> Case | list[Finding]:
    """Return the case of a plan's data, or what makes it unreadable.

    `build` makes recipes concrete; tests hand in circuits that are wrong.
    """
    texts = faults_of(data)
    sources = None if texts else _sources(data, texts)
    if sources is None:
        return [Finding("plan-malformed", where, what) for where, what in texts]
    source, device = sources
    found: list[Finding] = []
    program = _as_planned(data, source, device, found)
    if program is None:
        return found
    case = Case(data, program, device, Numbers(device))
    if "cleanup" in data:
        case.graph = values_of(source)
    _check_sources(case)
    _check_header(case)
    if any(found.rule == "source-changed" for found in case.findings):
        return case.findings
    if _read_wires(case) and _has_every_step(case):
        _read_steps(case, build)
    readable = len(case.steps) == len(case.program.operations)
    return case if readable else case.findings


def _sources(data: Row, texts: list[tuple[str, str]]) -> tuple[Program, Device] | None:
    """Read program and device again; what fails is added to `texts`."""
    stated, known = data["program"], data["device"]
    program = device = None
    try:
        program = read_program(
            stated["text"], stated["path"], open_inputs=data["open_inputs"]
        )
    except InputError as error:
        texts.append(("program", str(error)))
    try:
        device = read_device(known["text"], known["path"])
    except InputError as error:
        texts.append(("device", str(error)))
    return None if program is None or device is None else (program, device)


def _as_planned(
    data: Row, source: Program, device: Device, found: list[Finding]
) -> Program | None:
    """Return the program that the steps are the steps of; what is wrong is added."""
    moves = data.get("cleanup", {}).get("moves", [])
    if not moves:
        return source

    def find(rule: str, where: str, what: str) -> None:
        found.append(Finding(rule, where, what))

    return follow_moves(source, moves, device, find)


def _check_sources(case: Case) -> None:
    """Hashes, names and languages are those of the texts."""
    program, device = case.program, case.device
    for where, key, found in (
        ("program", "hash", program.hash),
        ("program", "name", program.name),
        ("program", "syntax", program.syntax),
        ("device", "hash", device.hash),
        ("device", "name", device.name),
        ("device", "syntax", "yaml"),
    ):
        stated = case.data[where][key]
        if stated != found:
            text = f"{key} {stated!r} is stated, the text gives {found!r}"
            case.find("source-changed", where, text)


def _check_header(case: Case) -> None:
    """What the head of the plan repeats from its sources is repeated rightly."""
    for where, found in (
        ("calibrated", case.device.calibrated),
        ("assumed", case.program.assumed),
    ):
        if case.data[where] != found:
            text = f"{case.data[where]!r} is stated, the source gives {found!r}"
            case.find("header-misstated", where, text)


def _read_wires(case: Case) -> bool:
    """Read the first site of every wire; whether all are there and exist."""
    stated, names = case.data["wires"], case.program.wire_names
    missing = sorted(set(names) ^ set(stated))
    for name in missing:
        what = "the program has no such wire" if name in stated else "it has no site"
        case.find("wire-missing", f"wire {name}", what)
    if missing:
        return False
    case.sites = [stated[name] for name in names]
    labels = [f"wire {name}" for name in names]
    # Every wire is asked, so that one pass finds all of them.
    known = [_exists(case, s, w) for s, w in zip(case.sites, labels, strict=True)]
    return all(known)


def _exists(case: Case, site: int, where: str) -> bool:
    """Whether the device has a site; it must also be in service."""
    if not 0 <= site < len(case.device.sites):
        text = f"there is no site {site}, the device has {len(case.device.sites)}"
        case.find("site-unknown", where, text)
        return False
    if not case.device.sites[site].in_service:
        case.find("site-out-of-service", where, f"site {site} is out of order")
    return True


def _has_every_step(case: Case) -> bool:
    calls = Counter(row["index"] for row in case.data["calls"])
    others = Counter(row[0] for row in case.data["others"])
    wanted_calls = {op.index for op in case.program.operations if op.is_call}
    wanted_others = {op.index for op in case.program.operations if not op.is_call}
    before = len(case.findings)
    for name, found, wanted in (
        ("calls", calls, wanted_calls),
        ("others", others, wanted_others),
    ):
        for index in sorted(set(found) | wanted):
            times, expected = found[index], int(index in wanted)
            if times != expected:
                text = f"planned {times} times, expected {expected}"
                case.find("step-missing", f"{name}, step {index}", text)
            if len(case.findings) > before + 20:
                return False
    return len(case.findings) == before


def _read_steps(case: Case, build: Build) -> None:
    calls = {row["index"]: row for row in case.data["calls"]}
    others = {row[0]: row for row in case.data["others"]}
    for op in case.program.operations:
        if op.is_call:
            step = _read_call(case, op, calls[op.index], build)
        else:
            _, start, end = others[op.index]
            where = [case.sites[w] for w in op.wires]
            step = Planned(op, as_written(op), start, end, (), where)
        if step is not None:
            case.steps.append(step)
            for wire in op.wires:
                case.uses.setdefault(wire, []).append(step)


def _read_call(case: Case, op: Operation, row: Row, build: Build) -> Planned | None:
    label = f"step {op.index}"
    for key, found in (("kind", op.kind), ("name", op.name), ("line", op.place.line)):
        if row[key] != found:
            text = f"{key} {row[key]!r} is stated, the program says {found!r}"
            case.find("step-misstated", label, text)
    names = library.names_for(op)
    if row["recipe"] not in names:
        text = f"'{row['recipe']}' is no recipe of '{op.title}'"
        case.find("recipe-unknown", label, text)
        return None
    _check_lost(case, label, row, names)
    if op.signature is None:
        angle = op.params[0] if op.params else 0.0
        built = build(row["recipe"], op.kind, op.controls, angle, op.inverse)
    else:
        built = library.build_for(row["recipe"], op)
    if row["workspace"] != built.workspace:
        text = f"'{row['workspace']}' is stated, '{built.recipe}' uses "
        case.find("workspace-misstated", label, text + f"'{built.workspace}'")
    leases = tuple(
        Lease(r["slot"], r["site"], r["kind"], r["start"], r["end"], r["lender"])
        for r in row["leases"]
    )
    good = _leases_match(case, label, row, built, leases)
    known = [_exists(case, one.site, f"{label}, slot {one.slot}") for one in leases]
    if not good or not all(known):
        return None
    where = [case.sites[w] for w in op.wires] + [one.site for one in leases]
    return Planned(op, built, row["start"], row["end"], leases, where)


def _check_lost(case: Case, label: str, row: Row, names: tuple[str, ...]) -> None:
    lost = Counter(name for name, _ in row["lost"])
    wanted = Counter(name for name in names if name != row["recipe"])
    if lost != wanted:
        odd = sorted(((lost - wanted) + (wanted - lost)).elements())
        text = f"lost recipes are misstated: {', '.join(odd)} (chosen: "
        case.find("lost-misstated", label, text + f"{row['recipe']})")


def _leases_match(
    case: Case, label: str, row: Row, built: Built, leases: tuple[Lease, ...]
) -> bool:
    """Slots and kinds of the recipe, the step's own time, no lender of clean slots."""
    time = (row["start"], row["end"])
    wanted = [(slot, kind, *time) for slot, kind in enumerate(built.slots)]
    found = [(one.slot, one.kind, one.start, one.end) for one in leases]
    if found != wanted:
        text = f"'{built.recipe}' needs (slot, kind, start, end) {wanted}, not {found}"
        case.find("lease-wrong", label, text)
        # Other times can still be judged; other slots cannot.
        return [one[:2] for one in found] == [one[:2] for one in wanted]
    for one in leases:
        if one.kind == "clean" and one.lender is not None:
            text = f"slot {one.slot} is clean and cannot be lent by {one.lender}"
            case.find("lease-wrong", label, text)
    return True
