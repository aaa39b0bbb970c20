"""The command `compare`: programs by devices, one table, one report.

Exit status: 0 if every program has a device that it fits on, 1 otherwise, 2 bad input,
130 interrupted (finished rows are printed, and kept where a results file is named).
"""

from __future__ import annotations

import json
import sys
from typing import TYPE_CHECKING, Any

import click

from placer.device.read import find_device, shipped_devices
from placer.errors import Fault, InputError, NoPlan
from placer.plan import POLICIES
from placer.report.outputs import STDOUT, check_targets, write_all
from placer.report.progress import Progress
from placer.report.words import look
from placer.units import ticks_down

if TYPE_CHECKING:
    from placer.compare import Job, Row

ALL = "all"
INTERRUPTED = 130


@click.command()
@click.argument("programs", metavar="PROGRAM...", nargs=-1, required=True)
@click.option(
    "-d",
    "--device",
    "devices",
    required=True,
    multiple=True,
    help="A shipped device or a YAML file (repeatable); 'all' for all shipped ones.",
)
@click.option(
    "--budget",
    "share",
    metavar="SHARE",
    type=click.FloatRange(0, 1000, min_open=True),
    help="Part of T1 or T2 that one value may live.",
)
@click.option(
    "--least-success",
    metavar="PROBABILITY",
    type=click.FloatRange(0, 1, min_open=True),
    help="Least expected success of a whole program.",
)
@click.option("--most-sites", type=click.IntRange(1), metavar="N", help="Most sites.")
@click.option(
    "--longest",
    "longest_us",
    type=click.FloatRange(0, 1e9, min_open=True),
    metavar="US",
    help="Longest run time in microseconds.",
)
@click.option(
    "--only",
    type=click.Choice(POLICIES),
    multiple=True,
    help="Allow only this kind of workspace (repeatable).",
)
@click.option(
    "--effort",
    type=click.Choice(["quick", "normal", "deep"]),
    default="normal",
    show_default=True,
    help="How much work each plan may do.",
)
@click.option(
    "--seed", type=click.IntRange(0, 2**31 - 1), default=0, help="Seed of the search."
)
@click.option(
    "--open-inputs",
    is_flag=True,
    help="Take every wire that is not declared scratch as unknown at the start.",
)
@click.option(
    "--results",
    metavar="FILE",
    help="Keep every finished row in FILE, and use those in it again.",
)
@click.option("--report", "report_file", metavar="FILE", help="Write a report (HTML).")
@click.option("--json", "as_json", is_flag=True, help="Print JSON on stdout.")
@click.option("-q", "--quiet", is_flag=True, help="No progress on stderr.")
@click.pass_context
def compare(
    context: click.Context,
    /,
    programs: tuple[str, ...],
    devices: tuple[str, ...],
    *,
    longest_us: float | None,
    results: str | None,
    report_file: str | None,
    as_json: bool,
    quiet: bool,
    **asked: Any,
) -> None:
    """Plan every PROGRAM on every device, and rank the devices.

    A device where a program cannot run says why.  An interrupted sweep goes on where it
    was, if --results names a file.
    """
    # Loaded late: importing the solver takes longer than most commands run.
    from placer.compare import Options, fits_somewhere, sweep
    from placer.report.comparetext import compare_data, compare_text

    if report_file == STDOUT and as_json:
        raise click.UsageError("only one of --json and --report - can use stdout")
    targets = [name for name in (report_file, results) if name is not None]
    if results == STDOUT:
        raise click.UsageError("--results needs a file")
    check_targets(targets, (*programs, *devices))
    jobs = _jobs(programs, devices, open_inputs=asked["open_inputs"])
    longest = None if longest_us is None else ticks_down(longest_us * 1e3)
    options = Options(longest_ns=longest, **asked)
    rows: list[Row] = []
    is_interrupted = False
    with Progress(sys.stderr, is_quiet=quiet) as progress:
        try:
            for row in sweep(jobs, options, results=results, progress=progress):
                rows.append(row)  # noqa: PERF402 - each counts as soon as it is known
        except KeyboardInterrupt:
            is_interrupted = True
    data = compare_data(rows)
    shown = compare_text(rows, left=len(jobs) - len(rows), **look(sys.stdout))
    if as_json:
        shown = json.dumps(data, indent=1, ensure_ascii=False) + "\n"
    if report_file is not None:
        from placer.report.comparehtml import compare_html

        texts = {report_file: compare_html(data)}
        shown = texts.pop(STDOUT, shown)
        write_all(texts)
    click.echo(shown, nl=False)
    if is_interrupted:
        context.exit(INTERRUPTED)
    if not fits_somewhere(rows):
        context.exit(NoPlan.exit_code)


def _jobs(
    programs: tuple[str, ...], devices: tuple[str, ...], *, open_inputs: bool
) -> list[Job]:
    """Read everything, and report the faults of all in one pass."""
    from placer.api import find_program
    from placer.compare import Job

    faults: list[Fault] = []
    found_devices, found_programs = [], []
    names = [
        name
        for one in devices
        for name in (shipped_devices() if one == ALL else (one,))
    ]
    for name in dict.fromkeys(names):
        try:
            found_devices.append(find_device(name))
        except InputError as error:
            faults += error.faults
    for name in dict.fromkeys(programs):
        try:
            found_programs.append(find_program(name, open_inputs=open_inputs))
        except InputError as error:
            faults += error.faults
    if faults:
        raise InputError(faults)
    return [Job(p, d) for p in found_programs for d in found_devices]
