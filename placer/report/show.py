"""Show what a device or a program contains, and what the check said.

In: what was read.  Out: text of a fixed width, or plain data for machines.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Protocol

from placer.program.values import values_of
from placer.report.words import WIDTH, Page, count, duration, listed, percent

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Sequence

    from placer.device.model import Device, Link
    from placer.program.model import Operation, Program

MOST_CALLS = 8
_CELL_GAP = 2


class CheckLike(Protocol):
    """The outcome of a check, as far as it is shown."""

    @property
    def ok(self) -> bool:
        """Whether every rule holds."""

    @property
    def findings(self) -> Sequence[Any]:
        """Every broken rule."""

    @property
    def rules(self) -> Sequence[Any]:
        """The rules that were looked at."""

    @property
    def notes(self) -> Sequence[str]:
        """What a reader of the result should know."""


# ------------------------------------------------------------------------- device


def device_text(device: Device, *, width: int = WIDTH, colour: bool = False) -> str:
    """Return what a device offers: sites, links, ranges, capabilities, a map."""
    page = Page(width, colour=colour)
    working = [site for site in device.sites if site.in_service]
    links = [link for link in device.links if device.is_usable(link)]
    page.paragraph(
        f"{device.name}: {count(len(working), 'site')} in service, "
        f"{count(len(links), 'usable link')}, {device.lattice}",
        shade="title",
    )
    page.paragraph(f"calibrated {device.calibrated or 'on a date not given'}")
    if device.note:
        page.paragraph(device.note)
    rows = [row for row in _device_ranges(device, links) if row is not None]
    page.heading("Figures of what is in service")
    page.table(("figure", "least", "median", "greatest"), rows)
    page.heading("Capabilities")
    for line in _capabilities(device):
        page.paragraph(line, indent=1)
    broken = [f"${site.id}" for site in device.sites if not site.in_service]
    if broken:
        page.paragraph(f"out of order: {listed(broken, 12)}", indent=1)
    drawing = device_map(device, page.width)
    if drawing:
        page.heading("Map" + (" (x: out of order)" if broken else ""))
        for line in drawing:
            page.line(line)
    return page.text()


def _device_ranges(
    device: Device, links: Sequence[Link]
) -> Iterable[tuple[str, str, str, str] | None]:
    sites = [site for site in device.sites if site.in_service]
    high = [site.level2 for site in sites if site.level2 is not None]

    def micro(value: float) -> str:
        return duration(1000 * value)

    yield _range("T1", [s.t1_us for s in sites], micro)
    yield _range("T2", [s.t2_us for s in sites], micro)
    yield _range("one-qubit gate error", [s.gate_error for s in sites], percent)
    yield _range("one-qubit gate time", [s.gate_ns for s in sites], duration)
    yield _range("two-qubit gate error", [k.error for k in links], percent)
    yield _range("two-qubit gate time", [k.time_ns for k in links], duration)
    yield _range("readout error", [s.readout_error for s in sites], percent)
    yield _range("readout time", [s.readout_ns for s in sites], duration)
    if device.capabilities.reset:
        yield _range("reset error", [s.reset_error for s in sites], percent)
        yield _range("reset time", [s.reset_ns for s in sites], duration)
    yield _range("level-2 lifetime", [x.t1_us for x in high], micro)
    yield _range("level-2 gate error", [k.level2_error for k in links], percent)
    yield _range("level-2 gate time", [k.level2_ns for k in links], duration)


def _range(
    title: str, values: Iterable[float | None], say: Callable[[float], str]
) -> tuple[str, str, str, str] | None:
    known = sorted(v for v in values if v is not None)
    if not known:
        return None
    # The lower median, as everywhere else in the package.
    return (title, say(known[0]), say(known[(len(known) - 1) // 2]), say(known[-1]))


def _capabilities(device: Device) -> list[str]:
    has = device.capabilities
    latency = has.conditional_ns
    after = "no" if latency is None else f"yes, {duration(latency)} after the readout"
    lines = [
        "measurement in mid-circuit: " + _yes(has.mid_circuit_measurement),
        f"conditional gates: {after}",
        "reset: " + _yes(has.reset),
        "measured cleanup: " + _yes(has.measured_cleanup),
    ]
    level2 = [s.id for s in device.sites if s.in_service and s.level2]
    lines.append(f"level 2: {count(len(level2), 'site')}" if level2 else "level 2: no")
    if device.t_gate is not None:
        lines.append(
            f"T gate: error {percent(device.t_gate.error)}, "
            f"{duration(device.t_gate.time_ns)}"
        )
    return lines


def _yes(flag: bool) -> str:
    return "yes" if flag else "no"


def device_map(device: Device, width: int) -> list[str]:
    """Return a drawing of a device whose links run along a square raster.

    Empty if the sites do not lie on whole coordinates, a link is longer than one
    step, or the drawing is too wide.
    """
    spots = {(x, y): i for i, (x, y) in enumerate(s.xy for s in device.sites)}
    if len(spots) != len(device.sites) or any(v != int(v) for xy in spots for v in xy):
        return []
    for link in device.links:
        (ax, ay), (bx, by) = device.sites[link.a].xy, device.sites[link.b].xy
        if abs(ax - bx) + abs(ay - by) != 1:
            return []
    cell = len(str(len(device.sites) - 1)) + 1
    columns = sorted({int(x) for x, _ in spots})
    rows = sorted({int(y) for _, y in spots})
    if (columns[-1] - columns[0] + 1) * (cell + _CELL_GAP) > width:
        return []
    lines: list[str] = []
    for y in range(rows[0], rows[-1] + 1):
        line = below = ""
        for x in range(columns[0], columns[-1] + 1):
            here, right, down = (
                spots.get(spot) for spot in ((x, y), (x + 1, y), (x, y + 1))
            )
            fill = "-" if _joined(device, here, right) else " "
            line += _mark(device, here).ljust(cell + _CELL_GAP, fill)
            bar = "|" if _joined(device, here, down) else ""
            below += bar.ljust(cell + _CELL_GAP)
        lines += [line.rstrip(), below.rstrip()]
    while lines and not lines[-1]:
        lines.pop()
    return lines


def _mark(device: Device, site: int | None) -> str:
    if site is None:
        return ""
    return str(site) if device.sites[site].in_service else "x"


def _joined(device: Device, a: int | None, b: int | None) -> bool:
    if a is None or b is None:
        return False
    link = device.link(a, b)
    return link is not None and device.is_usable(link)


def device_data(device: Device) -> dict[str, Any]:
    """Return what a device contains as plain data."""
    links = [link for link in device.links if device.is_usable(link)]
    working = [s for s in device.sites if s.in_service]
    return {
        "what": "device",
        "name": device.name,
        "calibrated": device.calibrated,
        "lattice": device.lattice,
        "hash": device.hash,
        "sites": len(device.sites),
        "in_service": len(working),
        "out_of_order": [s.id for s in device.sites if not s.in_service],
        "usable_links": [[link.a, link.b] for link in links],
        "level2_sites": [s.id for s in working if s.level2],
        "mid_circuit_measurement": device.capabilities.mid_circuit_measurement,
        "conditional_ns": device.capabilities.conditional_ns,
        "reset": device.capabilities.reset,
        "measured_cleanup": device.capabilities.measured_cleanup,
    }


# ------------------------------------------------------------------------ program


@dataclass(frozen=True, slots=True)
class Idle:
    """What is idle in program order while one call runs.

    `lendable` wires hold a value and may be lent; `clean` wires are in |0>, since
    they have not begun or are scratch that has ended; `kept` wires hold a value that
    must not be lent.
    """

    operation: Operation
    lendable: int
    clean: int
    kept: int


def idle_windows(program: Program) -> tuple[Idle, ...]:
    """Return for each call what is idle while it runs, in program order."""
    first: dict[int, int] = {}
    last: dict[int, int] = {}
    for op in program.operations:
        for wire in op.wires:
            first.setdefault(wire, op.index)
            last[wire] = op.index
    windows = []
    for op in program.calls:
        counts: Counter[str] = Counter()
        busy = set(map(int, op.wires))
        for number in range(len(program.wire_names)):
            if number not in busy:
                counts[_state(program, number, op.index, first, last)] += 1
        windows.append(Idle(op, counts["lendable"], counts["clean"], counts["kept"]))
    return tuple(windows)


def _state(
    program: Program, wire: int, now: int, first: dict[int, int], last: dict[int, int]
) -> str:
    register = program.register_at(wire)
    if register.start == "zero" and now < first.get(wire, now + 1):
        return "clean"
    if register.workspace and now > last.get(wire, -1):
        return "clean"
    return "lendable" if register.lendable else "kept"


def program_text(program: Program, *, width: int = WIDTH, colour: bool = False) -> str:
    """Return what a program asks for, and what could be lent while it runs."""
    page = Page(width, colour=colour)
    page.paragraph(
        f"{program.name}: {count(len(program.wire_names), 'wire')}, "
        f"{count(len(program.operations), 'step')}, "
        f"{count(len(program.calls), 'call')}, {program.syntax}",
        shade="title",
    )
    page.paragraph(f"assumed: {program.assumed}")
    page.heading("Registers")
    rows = [
        (
            register.name,
            str(register.width),
            "|0>" if register.start == "zero" else "unknown",
            "workspace" if register.workspace else "",
            "" if register.lendable else "never lent",
        )
        for register in program.registers
    ]
    page.table(("register", "wires", "<starts as", "<", "<"), rows)
    page.heading("Steps by kind")
    kinds = sorted(step_counts(program).items(), key=lambda item: (-item[1], item[0]))
    page.paragraph(", ".join(f"{name} {many}" for name, many in kinds) or "none", 1)
    if program.scopes:
        page.paragraph(
            f"{count(len(program.scopes), 'scope')} with compute, body, cleanup", 1
        )
        _values(page, program)
    _idle_table(page, program)
    return page.text()


def _values(page: Page, program: Program) -> None:
    """List the values whose cleanup a plan decides, and what stays as written."""
    graph = values_of(program)
    if not graph.values:
        page.paragraph("no scope makes values that can be kept or returned", 1)
        return
    page.heading("Values: when to clean them up is chosen with a device")
    rows = []
    for number, value in enumerate(graph.values):
        below = [graph.values[i].name for i in value.inputs]
        readers = sum(1 for use in graph.uses if number in use.needs)
        readers += sum(1 for other in graph.values if number in other.inputs)
        rows.append(
            (
                value.name,
                str(value.line),
                str(value.size),
                str(readers),
                listed(below, 4) if below else "-",
                "" if value.is_plain else "has phases: not by measurement",
            )
        )
    columns = ("value", "line", "wires", "readers", "<computed from", "<")
    page.table(columns, rows, drop=(5, 4))


def step_counts(program: Program) -> Counter[str]:
    """Return how often each kind of call and each plain gate occurs."""
    names: Counter[str] = Counter()
    for op in program.operations:
        names[_sort(op)] += 1
    return names


def _sort(op: Operation) -> str:
    if op.is_call:
        return f"{op.kind}({op.controls})"
    return op.name if op.kind == "gate" else op.kind


def _idle_table(page: Page, program: Program) -> None:
    windows = idle_windows(program)
    if not windows:
        return
    page.heading("What is idle while a call runs (in program order)")
    groups: dict[tuple[str, int], list[Idle]] = {}
    for window in windows:
        key = (window.operation.kind, window.operation.controls)
        groups.setdefault(key, []).append(window)
    ordered = sorted(groups.items(), key=lambda item: (-item[0][1], item[0][0]))
    rows = [
        (
            f"{kind}, {count(controls, 'control')}",
            str(len(group)),
            _span(w.lendable for w in group),
            _span(w.clean for w in group),
            _span(w.kept for w in group),
        )
        for (kind, controls), group in ordered[:MOST_CALLS]
    ]
    page.table(("calls", "count", "could be lent", "in |0>", "never lent"), rows)
    if len(ordered) > MOST_CALLS:
        page.line(f" and {count(len(ordered) - MOST_CALLS, 'smaller sort')}")


def _span(values: Iterable[int]) -> str:
    known = sorted(values)
    if known[0] == known[-1]:
        return str(known[0])
    return f"{known[0]} - {known[-1]}"


def program_data(program: Program) -> dict[str, Any]:
    """Return what a program contains as plain data."""
    return {
        "what": "program",
        "name": program.name,
        "syntax": program.syntax,
        "hash": program.hash,
        "assumed": program.assumed,
        "registers": [
            {
                "name": r.name,
                "width": r.width,
                "start": r.start,
                "workspace": r.workspace,
                "lendable": r.lendable,
            }
            for r in program.registers
        ],
        "wires": len(program.wire_names),
        "steps": dict(sorted(step_counts(program).items())),
        "scopes": len(program.scopes),
        "calls": [
            {
                "index": w.operation.index,
                "kind": w.operation.kind,
                "controls": w.operation.controls,
                "line": w.operation.place.line,
                "could_be_lent": w.lendable,
                "in_zero": w.clean,
                "never_lent": w.kept,
            }
            for w in idle_windows(program)
        ],
    }


# -------------------------------------------------------------------------- check


def check_text(
    result: CheckLike, path: str, *, width: int = WIDTH, colour: bool = False
) -> str:
    """Return what the check found: the verdict, every finding, the rules."""
    page = Page(width, colour=colour)
    rules = [rule_name(rule) for rule in result.rules]
    if result.ok:
        page.paragraph(
            f"CHECK PASSED: {path} keeps {count(len(rules), 'rule')}", shade="good"
        )
    else:
        found = count(len(result.findings), "finding")
        page.paragraph(f"CHECK FAILED: {path}, {found}", shade="bad")
        for finding in result.findings:
            page.paragraph(f"{finding.rule} at {finding.where}: {finding.what}", 1)
    if rules:
        page.paragraph(f"rules: {', '.join(rules)}")
    for note in result.notes:
        page.paragraph(f"note: {note}", 1)
    return page.text()


def rule_name(rule: object) -> str:
    """Return the name of a rule, whether it is given by name or as an object."""
    return str(getattr(rule, "name", rule))


def check_data(result: CheckLike, path: str) -> dict[str, Any]:
    """Return what the check found as plain data."""
    return {
        "what": "check",
        "plan": path,
        "ok": result.ok,
        "findings": [
            {"rule": str(f.rule), "where": str(f.where), "what": str(f.what)}
            for f in result.findings
        ],
        "rules": [rule_name(rule) for rule in result.rules],
        "notes": list(result.notes),
    }
