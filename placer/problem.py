"""Device + program + recipes + budget + goal, frozen and validated.

What the planner receives.  `choices[i]` are the recipes that step i may use on this
device under the workspace limits that were asked for; a step without competition (a
plain gate, a measurement) has exactly one.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Literal

from placer.errors import InputError, NoPlan, Place
from placer.recipes import library, standard
from placer.recipes.circuit import Built, Circuit, Op

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Budget, Device
    from placer.program.model import Operation, Program

Goal = Literal["error", "time", "sites", "t-gates", "estimate"]
AS_WRITTEN = "as-written"


@dataclass(frozen=True, slots=True)
class Problem:
    """One question to the planner.

    `goal` is what is least: `error` (the expected error of the included route), its
    `time`, its `sites`, its `t-gates`, each with the error second, or `estimate` (the
    placement cost, see DEVELOPERS.md).  `hash` identifies the content.
    """

    device: Device
    program: Program
    budget: Budget
    goal: Goal
    only: tuple[str, ...]
    choices: tuple[tuple[Built, ...], ...]
    hash: str


def make_problem(
    device: Device,
    program: Program,
    *,
    budget: Budget | None = None,
    goal: Goal = "error",
    only: Sequence[str] = (),
) -> Problem:
    """Collect what the planner needs, and refuse what cannot work.

    Raises
    ------
    InputError
        If the program does not fit the device whatever is chosen (too many wires, a
        measurement in mid-circuit where there is none).
    NoPlan
        If a call has no recipe left under the limits on workspace.
    """
    budget = device.budget if budget is None else budget
    only = tuple(sorted(set(only)))
    _need_room(device, program)
    choices = tuple(choices_for(op, device, program, only) for op in program.operations)
    digest = hashlib.sha256()
    moves = repr(program.moves)
    for part in (device.hash, program.hash, moves, repr(budget), goal, repr(only)):
        digest.update(part.encode() + b"\0")
    return Problem(device, program, budget, goal, only, choices, digest.hexdigest())


def as_written(op: Operation) -> Built:
    """Return the one way to do a step that is not a call."""
    count = len(op.wires)
    if op.kind == "gate":
        fine = _listening(standard.lower(op.name, op.params), op.condition)
        name = op.name
    else:
        fine = Circuit(
            count,
            (),
            (
                Op(
                    op.kind,
                    tuple(range(count)),
                    bit=0 if op.kind == "measure" else None,
                ),
            ),
            bits=1 if op.kind == "measure" else 0,
        )
        name = op.kind
    coarse_op = Op(name, tuple(range(count)), op.params, listens=op.condition)
    coarse = fine if op.kind != "gate" else Circuit(count, (), (coarse_op,))
    return Built(AS_WRITTEN, op.kind, 0, "none", False, coarse, fine)


def _listening(circuit: Circuit, bit: str | None) -> Circuit:
    """Return a circuit all of whose operations wait for a bit of the program."""
    if bit is None:
        return circuit
    return replace(circuit, ops=tuple(replace(op, listens=bit) for op in circuit.ops))


def every_recipe(op: Operation) -> tuple[Built, ...]:
    """Return every recipe that exists for a step, whatever the device."""
    if not op.is_call:
        return (as_written(op),)
    return tuple(library.build_for(name, op) for name in library.names_for(op))


def why_not(
    built: Built, device: Device, program: Program, only: Sequence[str]
) -> str | None:
    """Return why a recipe cannot be used at all here, or `None` if it can."""
    capabilities = device.capabilities
    if built.needs_measurement and not capabilities.measured_cleanup:
        return "the device has no measured cleanup"
    if built.level2_wires:
        offering = sum(1 for s in device.sites if s.in_service and s.level2)
        if offering < len(built.level2_wires):
            return (
                f"needs {len(built.level2_wires)} sites with level 2, "
                f"the device has {offering}"
            )
        if not any(k.level2_error is not None for k in device.links):
            return "no link of the device has a level-2 gate"
    free = sum(1 for s in device.sites if s.in_service) - built.coarse.operands
    if len(built.slots) > free:
        return f"needs {_sites(len(built.slots), _kinds(built))}, {max(free, 0)} exist"
    clean = sum(1 for kind in built.slots if kind == "clean")
    held = _wires_always_held(program)
    spare = sum(1 for s in device.sites if s.in_service) - held
    if clean > spare:
        return f"needs {_sites(clean, 'clean')}, {max(spare, 0)} can be free"
    if only and not _allowed(built, only):
        return f"excluded by the limit to {', '.join(only)}"
    return None


def _sites(count: int, kind: str) -> str:
    return f"{count} {kind} site" + ("" if count == 1 else "s")


def _kinds(built: Built) -> str:
    return "clean" if "clean" in built.slots else "borrowed"


def _allowed(built: Built, only: Sequence[str]) -> bool:
    return library.is_plain(built) or built.workspace in only


def _wires_always_held(program: Program) -> int:
    return sum(
        r.width for r in program.registers if not r.workspace and r.start == "unknown"
    )


def choices_for(
    op: Operation, device: Device, program: Program, only: Sequence[str]
) -> tuple[Built, ...]:
    """Return the recipes that a step may use on a device.

    Raises
    ------
    NoPlan
        If none is left.
    """
    candidates = every_recipe(op)
    if not op.is_call:
        return candidates
    reasons = {b.recipe: why_not(b, device, program, only) for b in candidates}
    left = tuple(b for b in candidates if reasons[b.recipe] is None)
    if not left:
        wanted = [b for b in candidates if not only or b.workspace in only]
        detail = "; ".join(f"{b.recipe}: {reasons[b.recipe]}" for b in wanted)
        limit = f" with {', '.join(only)} workspace only" if only else ""
        raise NoPlan(
            f"{op.place}: the call '{op.title}' has no recipe left{limit} "
            f"({detail or 'none exists'})"
        )
    return left


def _need_room(device: Device, program: Program) -> None:
    place = Place(program.path)
    in_service = sum(1 for s in device.sites if s.in_service)
    held = sum(r.width for r in program.registers if not r.workspace)
    if held > in_service:
        raise InputError.at(
            place,
            "too-many-wires",
            f"the program holds {held} wires, device {device.name} has {in_service} "
            "sites in service",
            "take a larger device or a smaller program",
        )
    capabilities = device.capabilities
    last = {
        w: op.index
        for op in program.operations
        if op.kind != "barrier"
        for w in op.wires
    }
    for op in program.operations:
        is_early = op.kind == "measure" and last[op.wires[0]] > op.index
        if is_early and not capabilities.mid_circuit_measurement:
            raise InputError.at(
                op.place,
                "no-mid-circuit-measurement",
                f"device {device.name} cannot measure a wire that is used again later",
                "measure at the end, or take a device with measurement in mid-circuit",
            )
        if op.kind == "reset" and not capabilities.reset:
            raise InputError.at(
                op.place,
                "no-reset",
                f"device {device.name} cannot reset a site",
                "take a device with reset, or remove the statement",
            )
