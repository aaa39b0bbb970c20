"""The whole chain in one call: read, plan, write, re-read, check."""

from __future__ import annotations

import dataclasses
from pathlib import Path
from typing import TYPE_CHECKING

from placer.check.verify import CheckResult, check_plan
from placer.device.model import Budget, Device
from placer.device.read import find_device, read_device
from placer.errors import InputError, InternalError, Place
from placer.halt import Halt
from placer.plan import FORMAT, Plan, from_json, to_json
from placer.planner.assemble import plan_of
from placer.planner.loop import Effort
from placer.planner.settle import Asked, settle
from placer.planner.warm import Earlier
from placer.problem import Goal, Problem, make_problem
from placer.program.model import Program
from placer.program.planned import planned_program
from placer.program.read import load_program, read_program
from placer.report.schema import faults_of
from placer.report.sorts import demo_programs
from placer.version import VERSION

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence


def plan(
    program: Program | str | Path,
    device: Device | str | Path,
    *,
    budget: Budget | float | None = None,
    goal: Goal = "error",
    only: Sequence[str] = (),
    effort: Effort = "normal",
    seed: int = 0,
    open_inputs: bool = False,
    cleanup: Asked = "optimised",
    earlier: Plan | str | None = None,
    wall_limit: float | None = None,
    halt: Halt | None = None,
    progress: Callable[[str], None] = lambda _: None,
) -> Plan:
    """Plan a program on a device and return the checked plan.

    Parameters
    ----------
    program, device
        Loaded objects, paths, or names of shipped ones.
    budget
        A `Budget`, or the share of min(T1, T2) that one value may live (0 to 1, the
        other limits then as in the device file); `None` takes the device's own.
    goal
        `error` for the least expected error of the included route; `time`, `sites` or
        `t-gates` for the least of those, then the error; `estimate` for the least
        placement cost (defined in DEVELOPERS.md).
    only
        Workspace policies to choose from (`clean`, `borrowed`, `level2`, `none`).
    effort, seed
        Amount of work and seed of every random choice; same values, same plan.
    open_inputs
        Take every wire that is not declared workspace as unknown at the start.
    cleanup
        When the values of scopes are computed and cleaned up: the best order that was
        found (`optimised`), the program's own (`as-written`), every value cleaned up
        right after each use (`at-once`), or all of them at the end (`at-end`).
    earlier
        A plan, or the JSON text of one, to start from: its choices are kept where
        they still make sense, and a wire moves only where that pays.
    wall_limit
        Seconds after which the search ends with the best plan so far; a safety net
        that changes nothing unless it is hit, which the plan's notes then say.
    halt
        The same as an object that another thread or a signal may interrupt.
    progress
        Called with a short line at each stage.

    Raises
    ------
    InputError
        If an input is wrong or cannot fit.
    NoPlan
        If no plan exists under the limits.
    OutOfTime
        If none was found in the work allowed.
    InternalError
        If the plan found does not pass the check (a bug).
    """
    halt = halt or Halt(wall_limit)
    if not isinstance(device, Device):
        device = find_device(str(device))
    if not isinstance(program, Program):
        program = find_program(str(program), open_inputs=open_inputs)
    if isinstance(budget, float | int):
        budget = dataclasses.replace(device.budget, share=float(budget))
    problem = make_problem(device, program, budget=budget, goal=goal, only=only)
    halt.keep(finishing_seconds(problem))
    outcome, orders = settle(
        problem,
        asked=cleanup,
        effort=effort,
        seed=seed,
        progress=progress,
        halt=halt,
        earlier=None if earlier is None else read_earlier(earlier),
    )
    result = plan_of(
        outcome, version=VERSION, seed=seed, effort=effort, notes=(), cleanup=orders
    )
    progress("check")
    verified = check_plan(to_json(result), "plan")
    if not verified.ok:
        lines = "\n".join(f"  {f.rule}: {f.where}: {f.what}" for f in verified.findings)
        raise InternalError(f"the plan did not pass its own check:\n{lines}")
    if verified.notes:
        notes = (*result.notes, *verified.notes)
        result = dataclasses.replace(result, notes=notes)
    return result


SECONDS_PER_OPERATION = 1.5e-4
"""About what bounds, reasons, writing and check take per fine operation."""


def finishing_seconds(problem: Problem) -> float:
    """Return about how long it takes to finish and check a plan that was found."""
    counts = [min(len(b.fine.ops) for b in row) for row in problem.choices]
    return SECONDS_PER_OPERATION * sum(counts)


def read_earlier(plan: Plan | str, path: str = "plan") -> Earlier:
    """Return an earlier plan in the form that planning starts from.

    Raises
    ------
    InputError
        If the text is no plan of this format.
    """
    text = to_json(plan) if isinstance(plan, Plan) else plan
    data = from_json(text, path)
    faults = faults_of("plan", data)
    if faults:
        raise InputError.at(
            Place(path),
            "not-a-plan",
            f"this is not a plan of format {FORMAT} ({faults[0]})",
            "give the file that 'placer plan --plan FILE' wrote",
        )
    source = data["program"]
    program = read_program(
        source["text"], source["path"], open_inputs=data["open_inputs"]
    )
    moves = (data.get("cleanup") or {}).get("moves", ())
    device = read_device(data["device"]["text"], data["device"]["path"])
    return Earlier(data, planned_program(program, moves, device))


def find_program(name: str, *, open_inputs: bool = False) -> Program:
    """Return the program of a path, or of the name of a demo program.

    Raises
    ------
    InputError
        If it cannot be read or has faults.
    """
    demos = demo_programs()
    if name in demos and not Path(name).exists():
        path = demos[name]
        text = path.read_text(encoding="utf-8")
        # The plan names the demo by its file name: no machine path travels with it.
        return read_program(text, path.name, open_inputs=open_inputs)
    return load_program(name, open_inputs=open_inputs)


def check(text: str, path: str = "plan") -> CheckResult:
    """Check a plan from its JSON text alone; see `placer.check`."""
    return check_plan(text, path)
