"""Verify both circuits of each distinct recipe of a plan, phases included.

In: a case.  Out: findings, and notes on what could not be followed.  Each circuit runs
on superpositions with random amplitudes: a random vector that comes out as the call's
own result, up to a global phase, proves the circuit on the span of its inputs (it is
an eigenvector of the ratio of the two, which only a multiple of 1 has everywhere).
Few wires: all inputs at once.  Many: those around `all controls on`, and random ones.
"""

from __future__ import annotations

import cmath
from dataclasses import replace
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

from placer.check import simulate
from placer.check.plain import spelled_wrong
from placer.program.signature import apply, digits, numbers, value_widths
from placer.recipes import arithmetic

if TYPE_CHECKING:
    from collections.abc import Callable

    from placer.check.case import Build, Case, Planned
    from placer.program.signature import Signature
    from placer.recipes.circuit import Built, Circuit

SEED = 20_260_301
MOST_STATES = 1 << 15
ALL_INPUTS = 6  # free wires whose inputs are all tried at once
FEW = (16, 3)  # inputs at once, the second where the first branches too much
STAND_IN = 9  # controls of the smaller call that stands in for one too wide

SMALL_WIDTH = 5  # of arithmetic that stands in for wider arithmetic

WIDE = "branches too much"


def check_circuits(case: Case, build: Build) -> list[str]:
    """Both circuits of every recipe do what the call asks for; return notes."""
    notes: list[str] = []
    seen: dict[tuple[object, ...], None] = {}
    for step in case.steps:
        op = step.op
        key = (
            step.built.recipe,
            op.kind,
            op.name,
            op.controls,
            op.params,
            op.inverse,
            op.signature,
        )
        if key in seen:
            continue
        seen[key] = None
        if op.kind == "gate" and spelled_wrong(op.name, op.params, step.built.fine.ops):
            case.find("recipe-wrong", step.label, "it is not spelled out rightly")
        if not op.is_call:
            continue
        if op.signature is None:
            fault = _controlled_fault(step, build, notes)
        else:
            fault = _signature_fault(step, op.signature, notes)
        if fault:
            text = f"'{step.built.recipe}': {fault}"
            case.find("recipe-wrong", step.label, text)
    return notes


def _controlled_fault(step: Planned, build: Build, notes: list[str]) -> str:
    """Return what is wrong with a multi-controlled recipe, or with its stand-in."""
    op = step.op
    angle = op.params[0] if op.params else 0.0
    fault = recipe_fault(step.built, angle, op.inverse)
    if not fault.startswith(WIDE):
        return fault
    name = f"'{step.built.recipe}' with {op.controls} controls"
    small = build(step.built.recipe, op.kind, STAND_IN, angle, op.inverse)
    fault = recipe_fault(small, angle, op.inverse)
    found = "fails" if fault else "simulated"
    notes.append(
        f"{name} {WIDE} for exact simulation: replayed on bits, "
        f"its form with {STAND_IN} controls {found}"
    )
    return fault


def _signature_fault(step: Planned, signature: Signature, notes: list[str]) -> str:
    """Return what is wrong with an arithmetic recipe, or with its stand-in."""
    recipe = step.built.recipe
    fault = arithmetic_fault(step.built, signature)
    if not fault.startswith(WIDE):
        return fault
    name = f"'{recipe}' for '{step.op.title}' {WIDE} for exact simulation"
    small = _smaller(signature)
    if small is None or recipe not in arithmetic.recipe_names(small):
        notes.append(f"{name}, and has no smaller form: replayed on bits only")
        return ""
    fault = arithmetic_fault(arithmetic.build(recipe, small), small)
    found = "fails" if fault else "simulated"
    notes.append(f"{name}: its form on {small.widths} wires {found}")
    return fault


def _smaller(signature: Signature) -> Signature | None:
    """Return the same call on few wires, `None` where it has a table."""
    if signature.table:
        return None
    widths = tuple(min(width, SMALL_WIDTH) for width in signature.widths)
    constant = signature.constant
    if constant is not None:
        constant %= 1 << widths[0]
    return replace(signature, widths=widths, constant=constant)


@lru_cache(maxsize=1024)
def arithmetic_fault(built: Built, signature: Signature) -> str:
    """Return what is wrong with an arithmetic recipe, empty if nothing."""
    for name, circuit in (("coarse", built.coarse), ("fine", built.fine)):
        if circuit.operands != signature.operands or circuit.slots != built.slots:
            return f"its {name} circuit has other wires than the call"
        text = _arithmetic_fault(built, circuit, signature)
        if text:
            return text if text == WIDE else f"its {name} circuit: {text}"
    return ""


def _arithmetic_fault(built: Built, circuit: Circuit, signature: Signature) -> str:
    for few in FEW:
        try:
            return _arithmetic_inputs(built, circuit, signature, few)
        except simulate.TooWide:
            continue
        except simulate.Misuse as error:
            return str(error)
    return WIDE


def _arithmetic_inputs(
    built: Built, circuit: Circuit, signature: Signature, few: int
) -> str:
    draw = np.random.default_rng(SEED)
    for trial in range(3):
        columns = {_promised_input(built, signature, draw) for _ in range(few)}
        levels = np.array(sorted(columns), dtype=np.uint8).T
        count = levels.shape[1]
        amplitudes = np.exp(2j * np.pi * draw.random(count)) * draw.uniform(0.5, 1)
        before = simulate.start(levels, amplitudes, draw, MOST_STATES)
        wanted = before.copy()
        widths = value_widths(signature)
        for column in range(count):
            held = [int(x) for x in levels[: signature.operands, column]]
            after = apply(signature, numbers(held, widths))
            wanted.levels[: signature.operands, column] = digits(after, widths)
        found, used = simulate.run(circuit, before, _outcomes(trial, draw))
        if not used <= set(built.level2_wires):
            return f"wires {sorted(used)} enter level 2, {built.level2_wires} are said"
        text = simulate.difference(wanted, found)
        if text:
            return text
    return ""


def _promised_input(
    built: Built, signature: Signature, draw: np.random.Generator
) -> tuple[int, ...]:
    """Return bits of all local wires that keep the promises of the call."""
    widths = value_widths(signature)
    values = [
        int(sum(int(b) << i for i, b in enumerate(draw.integers(0, 2, width))))
        for width in widths
    ]
    if draw.random() < 0.8:
        values[: signature.controls] = [1] * signature.controls
    at = signature.controls
    if signature.kind == "lookup":
        values[at] %= len(signature.table)
    if signature.kind == "sum" or (signature.kind == "lookup" and signature.inverse):
        first = at + len(signature.widths) - 1
        values[first:] = [0] * len(values[first:])
        if signature.inverse:
            values = list(apply(replace(signature, inverse=False), tuple(values)))
    slots = [0 if kind == "clean" else int(draw.integers(0, 2)) for kind in built.slots]
    return tuple(digits(values, widths) + slots)


@lru_cache(maxsize=1024)
def recipe_fault(built: Built, angle: float, inverse: bool) -> str:
    """Return what is wrong with a recipe, empty if nothing, `WIDE` if unknown."""
    for name, circuit in (("coarse", built.coarse), ("fine", built.fine)):
        if circuit.operands != built.controls + 1 or circuit.slots != built.slots:
            return f"its {name} circuit has other wires than the call"
        text = _circuit_fault(built, circuit, angle, is_inverse=inverse)
        if text:
            return text if text == WIDE else f"its {name} circuit: {text}"
    return ""


def _circuit_fault(
    built: Built, circuit: Circuit, angle: float, *, is_inverse: bool
) -> str:
    for few in FEW:
        try:
            return _on_inputs(built, circuit, angle, few, is_inverse=is_inverse)
        except simulate.TooWide:
            continue
        except simulate.Misuse as error:
            return str(error)
    return WIDE


def _on_inputs(
    built: Built, circuit: Circuit, angle: float, few: int, *, is_inverse: bool
) -> str:
    draw = np.random.default_rng(SEED)
    measured = any(op.name == "measure" for op in circuit.ops)
    for trial in range(3 if measured else 2):
        levels = _inputs(built, draw, few, is_inverse=is_inverse)
        count = levels.shape[1]
        amplitudes = np.exp(2j * np.pi * draw.random(count)) * draw.uniform(0.5, 1)
        before = simulate.start(levels, amplitudes, draw, MOST_STATES)
        wanted = _meaning(built, angle, before, is_inverse=is_inverse)
        choose = _outcomes(trial, draw)
        after, used = simulate.run(circuit, before, choose)
        if not used <= set(built.level2_wires):
            return f"wires {sorted(used)} enter level 2, {built.level2_wires} are said"
        text = simulate.difference(wanted, after)
        if text:
            return text
    return ""


def _outcomes(trial: int, draw: np.random.Generator) -> Callable[[], int]:
    """All measurements give 1, all give 0, then random outcomes."""
    if trial < 2:
        return lambda: 1 - trial
    return lambda: int(draw.integers(2))


def _inputs(
    built: Built, draw: np.random.Generator, few: int, *, is_inverse: bool
) -> simulate.Levels:
    """Return distinct inputs that keep the call's promise, one a column."""
    controls, width = built.controls, built.fine.width
    clean = [controls + 1 + s for s, kind in enumerate(built.slots) if kind == "clean"]
    fixed = [*clean, controls] if built.kind == "and" else clean
    free = [wire for wire in range(width) if wire not in fixed]
    if len(free) <= ALL_INPUTS:
        count = 2 ** len(free)
        levels = np.zeros((width, count), dtype=np.uint8)
        for place, wire in enumerate(free):
            levels[wire] = np.arange(count) >> place & 1
    else:
        levels = draw.integers(0, 2, (width, few), dtype=np.uint8)
        # Rare inputs are the interesting ones: most controls on, with all the rest
        # random, and a third with one control off.
        rare = 2 * few // 3 + 1
        levels[:controls, :rare] = 1
        for column in range(rare // 2 + 1, rare):
            levels[draw.integers(controls), column] = 0
        levels[controls, :2] = (0, 1)
    levels[clean] = 0
    if built.kind == "and":
        levels[controls] = levels[:controls].min(axis=0) if is_inverse else 0
    return np.unique(levels, axis=1)


def _meaning(
    built: Built, angle: float, before: simulate.State, *, is_inverse: bool
) -> simulate.State:
    """Return what the call makes of a state."""
    after = before.copy()
    target = built.controls
    on = after.levels[:target].min(axis=0) == 1
    if built.kind in ("mcx", "and"):
        after.levels[target] ^= on
        return after
    sign = -1.0 if is_inverse else 1.0
    turn = -1.0 if built.kind == "mcz" else cmath.exp(1j * sign * angle)
    after.amplitudes[on & (after.levels[target] == 1)] *= turn
    return after
