"""A plan file turned into what the rules look at, without believing any of it.

In: the JSON text.  Out: a `Case` with program and device read again from the texts in
the plan, or findings that say why there is none.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

import jsonschema

from placer.check.numbers import Numbers
from placer.device.read import read_device
from placer.errors import InputError
from placer.problem import as_written
from placer.program.read import read_program
from placer.recipes import catalog

if TYPE_CHECKING:
    from placer.device.model import Device
    from placer.program.model import Operation, Program
    from placer.recipes.circuit import Built

SCHEMA = Path(__file__).parent.parent / "schemas" / "plan.schema.json"


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
    """One step as the plan states it, with its recipe built again."""

    op: Operation
    built: Built
    start: int
    end: int
    leases: tuple[Lease, ...]
    where: list[int] = field(default_factory=list)

    @property
    def label(self) -> str:
        """Name the step for people."""
        line = f" at line {self.op.place.line}" if self.op.place.line else ""
        return f"step {self.op.index} ('{self.op.name}'{line})"


@dataclass(slots=True)
class Case:
    """Everything the rules look at."""

    data: dict[str, Any]
    program: Program
    device: Device
    numbers: Numbers
    sites: list[int]
    steps: list[Planned]
    findings: list[Finding] = field(default_factory=list)

    def find(self, rule: str, where: str, what: str) -> None:
        """Record a broken rule."""
        self.findings.append(Finding(rule, where, what))

    def order(self) -> list[Planned]:
        """Return the steps in placed order."""
        return sorted(self.steps, key=lambda s: (s.start, s.op.index))


def open_case(data: dict[str, Any]) -> Case | list[Finding]:
    """Return the case of a plan's data, or what makes it unreadable."""
    faults = _against_schema(data)
    if faults:
        return faults
    try:
        program = read_program(
            data["program"]["text"],
            data["program"]["path"],
            open_inputs=data["open_inputs"],
        )
        device = read_device(data["device"]["text"], data["device"]["path"])
    except InputError as error:
        return [Finding("plan-malformed", "sources", str(error))]
    findings = [
        Finding("source-changed", name, f"the text has hash {found}, not {stated}")
        for name, found, stated in (
            ("program", program.hash, data["program"]["hash"]),
            ("device", device.hash, data["device"]["hash"]),
        )
        if found != stated
    ]
    for name, found, stated in (
        ("program name", program.name, data["program"]["name"]),
        ("device name", device.name, data["device"]["name"]),
        ("calibration date", device.calibrated, data["calibrated"]),
        ("assumed start", program.assumed, data["assumed"]),
    ):
        if found != stated:
            findings.append(Finding("source-changed", name, f"{stated} is {found}"))
    if findings:
        return findings
    case = Case(data, program, device, Numbers(device), [], [], findings)
    _read_wires(case)
    if case.findings:
        return case.findings
    _read_steps(case)
    return case.findings or case


def _against_schema(data: dict[str, Any]) -> list[Finding]:
    schema = json.loads(SCHEMA.read_text(encoding="utf-8"))
    validator = jsonschema.Draft202012Validator(schema)
    found = []
    for error in validator.iter_errors(data):
        where = "/".join(str(part) for part in error.absolute_path) or "plan"
        found.append(Finding("plan-malformed", where, error.message[:200]))
        if len(found) == 20:
            break
    return sorted(found)


def _read_wires(case: Case) -> None:
    stated = case.data["wires"]
    names = case.program.wire_names
    for name in sorted(set(names) - set(stated)):
        case.find("wire-missing", name, "the plan gives it no site")
    for name in sorted(set(stated) - set(names)):
        case.find("wire-missing", name, "the program has no such wire")
    if case.findings:
        return
    for name in names:
        if known_site(case, stated[name], f"wire {name}"):
            case.sites.append(stated[name])


def known_site(case: Case, site: int, where: str) -> bool:
    """Whether a site exists and is in service; records a finding if not."""
    if not 0 <= site < len(case.device.sites):
        case.find("site-unknown", where, f"there is no site {site}")
        return False
    if not case.device.sites[site].in_service:
        case.find("site-out-of-service", where, f"site {site} is out of order")
        return False
    return True


def _read_steps(case: Case) -> None:
    calls = {row["index"]: row for row in case.data["calls"]}
    others = {row[0]: row for row in case.data["others"]}
    stated = [row["index"] for row in case.data["calls"]]
    stated += [row[0] for row in case.data["others"]]
    expected = list(range(len(case.program.operations)))
    if sorted(stated) != expected:
        case.find(
            "steps-incomplete",
            "steps",
            f"{len(stated)} steps are planned, the program has {len(expected)}",
        )
        return
    for op in case.program.operations:
        if op.is_call != (op.index in calls):
            case.find("steps-incomplete", f"step {op.index}", "its kind is misstated")
        elif op.is_call:
            _read_call(case, op, calls[op.index])
        else:
            _, start, end = others[op.index]
            where = [case.sites[w] for w in op.wires]
            case.steps.append(Planned(op, as_written(op), start, end, (), where))


def _read_call(case: Case, op: Operation, row: dict[str, Any]) -> None:
    label = f"step {op.index}"
    if row["kind"] != op.kind or row["name"] != op.name or row["line"] != op.place.line:
        case.find("steps-incomplete", label, "kind, name or line is misstated")
        return
    names = catalog.recipe_names(op.kind, op.controls, op.inverse)
    if row["recipe"] not in names:
        case.find(
            "recipe-unknown",
            label,
            f"'{row['recipe']}' is no recipe of {op.kind} with {op.controls} controls",
        )
        return
    angle = op.params[0] if op.params else 0.0
    built = catalog.build(row["recipe"], op.kind, op.controls, angle, op.inverse)
    leases = tuple(
        Lease(r["slot"], r["site"], r["kind"], r["start"], r["end"], r["lender"])
        for r in row["leases"]
    )
    good = all(known_site(case, one.site, f"{label} slot {one.slot}") for one in leases)
    wanted = [(slot, kind) for slot, kind in enumerate(built.slots)]
    found = [(one.slot, one.kind) for one in leases]
    times = {(one.start, one.end) for one in leases} <= {(row["start"], row["end"])}
    if found != wanted or not times or row["workspace"] != built.workspace:
        case.find(
            "lease-wrong",
            label,
            f"'{built.recipe}' needs slots {wanted} over [{row['start']}, "
            f"{row['end']}), the plan leases {found}",
        )
        good = False
    if good:
        where = [case.sites[w] for w in op.wires] + [one.site for one in leases]
        case.steps.append(Planned(op, built, row["start"], row["end"], leases, where))
