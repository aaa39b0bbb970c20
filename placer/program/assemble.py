"""A finished draft to the frozen program: start states, names, hash."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from pathlib import PurePath
from typing import Literal

from placer.errors import InputError, Place
from placer.program.draft import Draft, DraftRegister, Part, Step
from placer.program.model import Operation, Program, Register, Scope, WireId

PARTS: tuple[Part, ...] = ("compute", "body", "cleanup")
Syntax = Literal["openqasm2", "openqasm3", "yaml"]


def assemble(
    draft: Draft,
    syntax: Syntax,
    text: str,
    path: str,
    *,
    name: str = "",
    open_inputs: bool = False,
) -> Program:
    """Return the program of a draft.

    Raises
    ------
    InputError
        If it has no qubits at all.
    """
    if not draft.registers:
        raise InputError.at(Place(path), "no-qubits", "the program declares no qubits")
    steps, was_reset = _without_first_resets(draft, open_inputs=open_inputs)
    registers = tuple(_frozen(register) for register in draft.registers)
    operations = tuple(_operation(i, step) for i, step in enumerate(steps))
    return Program(
        name=name or (PurePath(path).stem if path != "-" else "program"),
        syntax=syntax,
        registers=registers,
        wire_names=tuple(
            register.name if register.is_single else f"{register.name}[{i}]"
            for register in registers
            for i in range(register.width)
        ),
        operations=operations,
        scopes=_scopes(draft, steps),
        bits=tuple(draft.bits),
        kept=tuple(draft.kept),
        assumed=_assumed(draft, syntax, was_reset, open_inputs=open_inputs),
        open_inputs=open_inputs,
        text=text,
        path=path,
        hash=_hash(draft, syntax, text, open_inputs=open_inputs),
        register_of=tuple(
            number
            for number, register in enumerate(registers)
            for _ in range(register.width)
        ),
    )


def _operation(index: int, step: Step) -> Operation:
    return Operation(
        index,
        step.kind,
        step.name,
        tuple(WireId(wire) for wire in step.wires),
        step.params,
        step.inverse,
        step.bit,
        step.place,
        step.scope,
        step.part,
        step.annotations,
        step.signature,
        step.condition,
    )


def _frozen(register: DraftRegister) -> Register:
    return Register(
        name=register.name,
        width=register.width,
        is_single=register.is_single,
        start=register.start,
        workspace=register.is_workspace,
        lendable=register.is_lendable,
        first=WireId(register.first),
        place=register.place,
    )


def _without_first_resets(
    draft: Draft, *, open_inputs: bool
) -> tuple[list[Step], list[str]]:
    """Let registers that are reset as a whole before any use start in |0>.

    Their first resets are taken out; the names of the registers come back as well.
    """
    first: dict[int, int] = {}
    for number, step in enumerate(draft.steps):
        if step.kind != "barrier":
            for wire in step.wires:
                first.setdefault(wire, number)
    dropped: set[int] = set()
    names = []
    for register in draft.registers:
        wires = range(register.first, register.first + register.width)
        numbers = [first[wire] for wire in wires if wire in first]
        numbers = [n for n in numbers if draft.steps[n].kind == "reset"]
        if register.is_workspace:
            dropped.update(numbers)
        elif len(numbers) == register.width and not open_inputs:
            dropped.update(numbers)
            register.start = "zero"
            names.append(register.name)
    steps = [step for n, step in enumerate(draft.steps) if n not in dropped]
    return steps, names


def _scopes(draft: Draft, steps: Sequence[Step]) -> tuple[Scope, ...]:
    """Return scopes with the ranges of their parts; nested steps count as well."""
    ranges: dict[tuple[int, Part], list[int]] = {}
    for index, step in enumerate(steps):
        number, part = step.scope, step.part
        while number >= 0:
            span = ranges.setdefault((number, part), [index, index])
            span[1] = index + 1
            number, part = draft.scopes[number].parent, draft.scopes[number].part
    result = []
    for scope in draft.scopes:
        spans = []
        # An empty part stands where the part before it ends.
        parts = [ranges.get((scope.number, part)) for part in PARTS]
        end = min((found[0] for found in parts if found), default=0)
        for found in parts:
            first, end = found or (end, end)
            spans.append((first, end))
        compute, body, cleanup = spans
        result.append(
            Scope(
                scope.number,
                scope.parent,
                scope.name,
                compute,
                body,
                cleanup,
                scope.place,
                scope.part,
            )
        )
    return tuple(result)


def _assumed(
    draft: Draft, syntax: Syntax, was_reset: Sequence[str], *, open_inputs: bool
) -> str:
    parts = []
    plain = [register for register in draft.registers if not register.is_workspace]
    workspace = [register for register in draft.registers if register.is_workspace]
    if open_inputs:
        parts.append("every qubit that is not workspace may hold anything at the start")
    elif syntax == "openqasm2":
        parts.append("every qubit starts in |0>, as OpenQASM 2 says")
    elif syntax == "openqasm3":
        if any(register.start == "unknown" for register in plain):
            parts.append("qubits may hold anything at the start, as OpenQASM 3 says")
    else:
        parts.append("registers start as the program states")
    if was_reset:
        parts.append(
            f"{_listed(was_reset)} start in |0>, since the program resets them "
            "before any use; these resets are left out"
        )
    if workspace and syntax != "yaml":
        names = _listed([register.name for register in workspace])
        parts.append(f"workspace {names} starts in |0>, as its annotation says")
    parts.extend(draft.notes)
    return "; ".join(parts)


def _listed(names: Sequence[str]) -> str:
    shown = [f"'{name}'" for name in names[:8]]
    if len(names) > 8:
        shown.append(f"{len(names) - 8} more")
    return ", ".join(shown)


def _hash(draft: Draft, syntax: Syntax, text: str, *, open_inputs: bool) -> str:
    """Return a hash of everything that the program is made from."""
    digest = hashlib.sha256()
    for part in (syntax, str(open_inputs), text, *draft.sources):
        data = part.encode("utf-8", "surrogatepass")
        digest.update(f"{len(data)}:".encode())
        digest.update(data)
    return digest.hexdigest()
