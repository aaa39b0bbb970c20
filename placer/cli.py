"""The command line: parse, call, print, exit.

stdout carries the result, stderr everything else.  Exit status: 0 a plan that fits;
1 a plan that does not fit or a failed check; 2 bad input; 3 no plan found in the work
allowed; 70 a bug; 130 interrupted.  The solver is loaded only by the commands that
need it.
"""

from __future__ import annotations

import dataclasses
import errno
import json
import math
import os
import shlex
import sys
import traceback
from pathlib import Path
from typing import TYPE_CHECKING, Any, NoReturn, cast

import click

from placer.cli_compare import compare
from placer.errors import (
    CheckFailed,
    Fault,
    InputError,
    InternalError,
    NoPlan,
    OutOfTime,
    Place,
    PlacerError,
    did_you_mean,
)
from placer.halt import Halt, Interrupted
from placer.interrupts import stoppable
from placer.plan import POLICIES, to_json
from placer.program.planned import planned_program
from placer.report.outputs import STDOUT, check_targets, write_all
from placer.report.progress import Progress
from placer.report.sorts import demo_programs, sort_of
from placer.report.words import look
from placer.units import ticks_down
from placer.version import VERSION

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Budget, Device
    from placer.plan import Plan
    from placer.program.model import Program
    from placer.report.qasm import Gates

INTERRUPTED = 130
CHECKED = "checked: verified rule by rule from its own text before it was shown"
_SCHEMAS = ("device", "program", "plan")


class Commands(click.Group):
    """The group of commands; turns every error into its text and exit status."""

    def invoke(self, ctx: click.Context) -> Any:
        """Run a command, and exit with the status that its error owns."""
        try:
            return super().invoke(ctx)
        except (KeyboardInterrupt, Interrupted):
            click.echo("\nplacer: interrupted; nothing was written", err=True)
            ctx.exit(INTERRUPTED)
        except PlacerError as error:
            click.echo(_error_text(error), err=True)
            ctx.exit(error.exit_code)
        except (click.ClickException, click.exceptions.Exit, click.Abort):
            raise
        except Exception as error:
            if isinstance(error, OSError) and error.errno == errno.EPIPE:
                raise
            click.echo(_bug_text(error), err=True)
            ctx.exit(InternalError.exit_code)


@click.group(
    cls=Commands,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 80},
)
@click.version_option(VERSION, "--version", message="placer %(version)s")
def main() -> None:
    """Choose recipes, workspace, lenders, sites and timing for a quantum program.

    Exit status: 0 a plan that fits; 1 a plan that does not fit, or a failed check;
    2 bad input; 3 no plan found in the work allowed; 70 a bug.
    """


_quiet = click.option("-q", "--quiet", is_flag=True, help="No progress on stderr.")
_json = click.option("--json", "as_json", is_flag=True, help="Print JSON on stdout.")


def _finite(
    ctx: click.Context, parameter: click.Parameter, value: float | None
) -> float | None:
    if value is not None and not math.isfinite(value):
        raise click.BadParameter(f"{value} is not a number", ctx, parameter)
    return value


@main.command()
@click.argument("program")
@click.option("-d", "--device", required=True, help="A shipped device or a YAML file.")
@click.option(
    "--budget",
    "share",
    metavar="SHARE",
    type=click.FloatRange(0, 1000, min_open=True),
    callback=_finite,
    help="Part of T1 or T2 that one value may live, such as 0.5.",
)
@click.option(
    "--least-success",
    metavar="PROBABILITY",
    type=click.FloatRange(0, 1, min_open=True),
    callback=_finite,
    help="Least expected success of the whole program.",
)
@click.option(
    "--most-sites", type=click.IntRange(1), metavar="N", help="Most sites to touch."
)
@click.option(
    "--longest",
    "longest_us",
    type=click.FloatRange(0, 1e9, min_open=True),
    callback=_finite,
    metavar="US",
    help="Longest run time of the program in microseconds.",
)
@click.option(
    "--goal",
    type=click.Choice(["error", "time", "sites", "t-gates", "estimate"]),
    default="error",
    show_default=True,
    help="What is made least; the expected error comes second.",
)
@click.option(
    "--effort",
    type=click.Choice(["quick", "normal", "deep"]),
    default="normal",
    show_default=True,
    help="How much work the search may do.",
)
@click.option(
    "--seed",
    type=click.IntRange(0, 2**31 - 1),
    default=0,
    show_default=True,
    help="Seed of the search; the same seed gives the same plan.",
)
@click.option(
    "--only",
    type=click.Choice(POLICIES),
    multiple=True,
    help="Allow only this kind of workspace (repeatable).",
)
@click.option(
    "--cleanup",
    type=click.Choice(["optimised", "as-written", "at-once", "at-end"]),
    default="optimised",
    show_default=True,
    help="When values of scopes are cleaned up.",
)
@click.option(
    "--open-inputs",
    is_flag=True,
    help="Take every wire that is not declared scratch as unknown at the start.",
)
@click.option(
    "--from",
    "from_file",
    metavar="PLAN",
    help="Start from an earlier plan; wires move only where that pays.",
)
@click.option(
    "--wall-limit",
    type=click.FloatRange(0, 1e7, min_open=True),
    callback=_finite,
    metavar="SECONDS",
    help="End by then with the best plan so far; a plan says when it was hit.",
)
@click.option("--plan", "plan_file", metavar="FILE", help="Write the plan as JSON.")
@click.option(
    "--qasm", "qasm_file", metavar="FILE", help="Write placed OpenQASM 3, unrouted."
)
@click.option(
    "--routed",
    "routed_file",
    metavar="FILE",
    help="Write OpenQASM 3 with the swaps of the included route.",
)
@click.option(
    "--report",
    "report_file",
    metavar="FILE",
    help="Write a report (HTML), and plan again for its curves.",
)
@click.option(
    "--gates",
    type=click.Choice(["toffoli", "clifford-t"]),
    default="toffoli",
    show_default=True,
    help="Gate level of the placed OpenQASM.",
)
@_json
@_quiet
def plan(
    program: str,
    device: str,
    *,
    share: float | None,
    least_success: float | None,
    most_sites: int | None,
    longest_us: float | None,
    from_file: str | None,
    wall_limit: float | None,
    plan_file: str | None,
    qasm_file: str | None,
    routed_file: str | None,
    report_file: str | None,
    gates: str,
    as_json: bool,
    quiet: bool,
    **options: Any,
) -> None:
    """Plan PROGRAM for one device: the verdict, and what it rests on.

    PROGRAM is an OpenQASM 2 or 3 file, a program YAML file, or the name of a demo
    program.  A FILE of '-' is standard output.
    """
    halt = Halt(wall_limit)
    files = (plan_file, qasm_file, routed_file, report_file)
    targets = [name for name in files if name is not None]
    _one_on_stdout(targets, as_json=as_json)
    check_targets(targets, (program, device))
    source, chosen = _read_both(program, device, open_inputs=options["open_inputs"])
    budget = _budget(chosen, share, least_success, most_sites, longest_us)
    earlier = None if from_file is None else _read_text(from_file)
    with Progress(sys.stderr, is_quiet=quiet) as progress, stoppable(halt, progress):
        # Loaded late: importing the solver takes longer than most commands run.
        from placer.api import plan as find_plan

        found = find_plan(
            source,
            chosen,
            budget=budget,
            earlier=earlier,
            halt=halt,
            progress=progress,
            **options,
        )
    texts: dict[str, str] = {}
    if plan_file is not None:
        texts[plan_file] = to_json(found)
    moves = () if found.cleanup is None else found.cleanup.moves
    planned = planned_program(source, moves, chosen)
    if qasm_file is not None:
        from placer.report.qasm import placed_qasm

        level = cast("Gates", gates)
        texts[qasm_file] = placed_qasm(found, planned, chosen, gates=level)
    if routed_file is not None:
        from placer.report.routed import routed_qasm

        texts[routed_file] = routed_qasm(found, planned, chosen)
    if report_file is not None:
        texts[report_file] = _report_text(to_json(found))
    _put(texts, found, as_json=as_json, quiet=quiet)
    if not found.verdict.fits:
        _exit(NoPlan.exit_code)


def _put(texts: dict[str, str], found: Plan, *, as_json: bool, quiet: bool) -> None:
    """Write the files, then print the one result that stdout is for."""
    from placer.report.text import plan_text

    checked = CHECKED
    on_stdout = to_json(found) if as_json else texts.pop(STDOUT, None)
    shown = plan_text(found, checked=checked, **look(sys.stdout))
    write_all(texts)
    if on_stdout is None:
        click.echo(shown, nl=False)
        return
    click.echo(on_stdout, nl=False)
    if not quiet:
        click.echo(plan_text(found, checked=checked), nl=False, err=True)


def _report_text(plan_json: str) -> str:
    """Return the report of a plan that has passed its check."""
    # Loaded late: the charting library takes longer than most commands run.
    from placer.report.html import report_html

    return report_html(json.loads(plan_json))


def _one_on_stdout(targets: Sequence[str], *, as_json: bool) -> None:
    if targets.count(STDOUT) + as_json > 1:
        raise click.UsageError(
            "standard output has room for one result: only one of --json, --plan -, "
            "--qasm -, --routed -, --report - can use it"
        )


def _budget(
    device: Device,
    share: float | None,
    least_success: float | None,
    most_sites: int | None,
    longest_us: float | None,
) -> Budget:
    """Return the device's budget with what the command line says instead."""
    given = {
        "share": share,
        "least_success": least_success,
        "most_sites": most_sites,
        "longest_ns": None if longest_us is None else ticks_down(longest_us * 1e3),
    }
    changes: dict[str, Any] = {k: v for k, v in given.items() if v is not None}
    return dataclasses.replace(device.budget, **changes)


def _read_both(
    program: str, device: str, *, open_inputs: bool
) -> tuple[Program, Device]:
    """Read both inputs, and report the faults of both in one pass."""
    faults: list[Fault] = []
    source = chosen = None
    try:
        chosen = _load_device(device)
    except InputError as error:
        faults += error.faults
    try:
        source = _load_program(program, open_inputs=open_inputs)
    except InputError as error:
        faults += error.faults
    if source is None or chosen is None:
        raise InputError(faults)
    return source, chosen


@main.command()
@click.argument("plan_file", metavar="PLAN")
@_json
def check(plan_file: str, *, as_json: bool) -> None:
    """Verify PLAN from the file alone: every rule, every figure."""
    from placer.check.verify import check_plan
    from placer.report.show import check_data, check_text

    result = check_plan(_read_text(plan_file), plan_file)
    if as_json:
        _print_json(check_data(result, plan_file))
    else:
        click.echo(check_text(result, plan_file, **look(sys.stdout)), nl=False)
    if not result.ok:
        _exit(CheckFailed.exit_code)


@main.command()
@click.argument("name", metavar="FILE", default="")
@click.option(
    "--open-inputs",
    is_flag=True,
    help="Take every wire that is not declared scratch as unknown at the start.",
)
@click.option(
    "--recipes",
    is_flag=True,
    help="FILE is a kind of call (mcx, add, ...): list its recipes; all without it.",
)
@click.option(
    "--size",
    type=click.IntRange(min=2),
    default=8,
    show_default=True,
    metavar="N",
    help="With --recipes: number of controls, or width of the registers.",
)
@click.option(
    "-d",
    "--device",
    "device_name",
    help="With --recipes: add time and least error on this device.",
)
@click.option(
    "--report",
    "report_file",
    metavar="HTML",
    help="Where FILE is a plan: write its report.",
)
@_json
def show(
    name: str,
    *,
    open_inputs: bool,
    recipes: bool,
    size: int,
    device_name: str | None,
    report_file: str | None,
    as_json: bool,
) -> None:
    """Show what a device, a program or a plan contains, or the recipes of a call.

    FILE is a device, program or plan file, or the name of a shipped device or demo
    program; with --recipes it is a kind of call.
    """
    from placer.report import show as shown

    if recipes:
        _show_recipes(name, size, device_name, as_json=as_json)
        return
    if not name:
        raise click.UsageError("Missing argument 'FILE'.")
    if device_name is not None:
        raise click.UsageError("'--device' goes with '--recipes'.")
    sort = sort_of(name)
    if sort == "plan":
        _show_plan(name, report_file, as_json=as_json)
        return
    if report_file is not None:
        raise click.UsageError("'--report' needs a plan file.")
    if sort == "device":
        device = _load_device(name)
        if as_json:
            _print_json(shown.device_data(device))
        else:
            click.echo(shown.device_text(device, **look(sys.stdout)), nl=False)
        return
    program = _load_program(name, open_inputs=open_inputs)
    if as_json:
        _print_json(shown.program_data(program))
    else:
        click.echo(shown.program_text(program, **look(sys.stdout)), nl=False)


def _show_plan(name: str, report_file: str | None, *, as_json: bool) -> None:
    """Print a plan again, and write its report; one that fails its check gets none."""
    from placer.check.verify import check_plan
    from placer.planread import plan_of_data
    from placer.report.show import check_text
    from placer.report.text import plan_text

    targets = [] if report_file is None else [report_file]
    _one_on_stdout(targets, as_json=as_json)
    check_targets(targets, (name,))
    text = _read_text(name)
    result = check_plan(text, name)
    if not result.ok:
        click.echo(check_text(result, name, **look(sys.stderr)), nl=False, err=True)
        _exit(CheckFailed.exit_code)
    texts = {} if report_file is None else {report_file: _report_text(text)}
    on_stdout = text if as_json else texts.pop(STDOUT, None)
    write_all(texts)
    if on_stdout is None:
        shown = plan_of_data(json.loads(text))
        on_stdout = plan_text(shown, checked=CHECKED, **look(sys.stdout))
    click.echo(on_stdout, nl=False)


def _show_recipes(
    kind: str, size: int, device_name: str | None, *, as_json: bool
) -> None:
    from placer.report.recipes import kinds, kinds_text, recipe_rows, recipes_text

    if not kind:
        if device_name is not None:
            raise click.UsageError("'--device' needs a kind of call.")
        if as_json:
            found = {name: list(names) for name, (_, names) in kinds(size).items()}
            _print_json({"kinds": found})
        else:
            click.echo(kinds_text(size, **look(sys.stdout)), nl=False)
        return
    device = None if device_name is None else _load_device(device_name)
    if as_json:
        _print_json({"kind": kind, "recipes": recipe_rows(kind, size, device)})
    else:
        text = recipes_text(kind, size, device, **look(sys.stdout))
        click.echo(text, nl=False)


@main.command()
@click.argument("what", type=click.Choice(_SCHEMAS))
def schema(what: str) -> None:
    """Print the JSON Schema of a device file, a program file or a plan."""
    from placer.report.schema import schema_text

    click.echo(schema_text(what), nl=False)


# ------------------------------------------------------------------------- helpers


def _load_program(name: str, *, open_inputs: bool) -> Program:
    from placer.program.read import load_program, read_program

    demos = demo_programs()
    demo = demos.get(name)
    if demo is None:
        if name != STDOUT and not Path(name).suffix and not Path(name).exists():
            near = did_you_mean(name, tuple(demos))
            known = f"demo programs: {', '.join(demos) or 'none'}"
            raise InputError.at(
                Place(name or "(no name)"),
                "not-found",
                f"there is no file or demo program '{name}'",
                f"{near} {known}".strip(),
            )
        return load_program(name, open_inputs=open_inputs)
    # Named by its file alone: where the package is installed is nobody's business.
    text = demo.read_text(encoding="utf-8")
    return read_program(text, demo.name, open_inputs=open_inputs)


def _load_device(name: str) -> Device:
    from placer.device.read import find_device

    return find_device(name)


def _read_text(path: str) -> str:
    try:
        if path == STDOUT:
            return sys.stdin.buffer.read().decode("utf-8")
        return Path(path).read_text(encoding="utf-8")
    except OSError as error:
        raise InputError.at(
            Place(path), "not-read", f"'{path}' cannot be read ({error.strerror})"
        ) from error
    except UnicodeDecodeError as error:
        raise InputError.at(
            Place(path), "not-text", f"'{path}' is not UTF-8 text", "give a plan file"
        ) from error


def _print_json(data: dict[str, Any]) -> None:
    click.echo(json.dumps(data, indent=1, ensure_ascii=False))


def _exit(status: int) -> NoReturn:
    click.get_current_context().exit(status)


def _error_text(error: PlacerError) -> str:
    if isinstance(error, InputError):
        return str(error)
    if isinstance(error, NoPlan):
        return f"placer: no plan is possible: {error}"
    if isinstance(error, OutOfTime):
        return (
            f"placer: no plan was found in the work allowed: {error}\n"
            "  help: try --effort deep, or relax a limit"
        )
    if isinstance(error, InternalError):
        return _bug_text(error)
    return f"placer: {error}"


def _bug_text(error: Exception) -> str:
    """Return what a report of a bug needs: the place, and how to see it again."""
    if os.environ.get("PLACER_TRACE"):
        return "".join(traceback.format_exception(error)).rstrip()
    frames = traceback.extract_tb(error.__traceback__)
    place = f" ({Path(frames[-1].filename).name}:{frames[-1].lineno})" if frames else ""
    command = shlex.join(["placer", *sys.argv[1:]])
    return (
        f"placer {VERSION}: internal error: {type(error).__name__}: {error}{place}\n"
        "  this is a bug of placer, not of your input; please report it with the\n"
        "  input files and this command, which shows it again in full:\n"
        f"  PLACER_TRACE=1 {command}"
    )


main.add_command(compare)

if __name__ == "__main__":
    main()
