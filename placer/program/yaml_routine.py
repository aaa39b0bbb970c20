"""Routines in program YAML: named steps with arguments and scratch of their own.

A routine is read once by itself, on registers of its own: that finds its faults, shows
that its scratch comes back, and verifies what it claims to compute.  Each call writes
its steps out again on the wires it is given, with fresh scratch; a routine with a
verified claim becomes one call of that kind, for which recipes may be chosen.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace

import numpy as np

from placer.errors import Fault, InputError, Place
from placer.program.assemble import assemble
from placer.program.claims import SAMPLES, Replay, check_claims
from placer.program.draft import Draft, DraftScope, Step
from placer.program.model import Program
from placer.program.signature import (
    Signature,
    apply,
    digits,
    numbers,
    promised,
    value_widths,
)
from placer.program.yaml_block import add_workspace, read_part
from placer.program.yaml_operand import NAME, RESERVED
from placer.program.yaml_step import WIDEST, Routine, Routines, Steps
from placer.yamlnode import Node

_KEYS = ("arguments", "scratch", "borrowed", "steps", "computes")
# Gates that only move bits: what a claim about integers can be verified on.
_PERMUTING = frozenset({"x", "cx", "swap"})

Readers = Mapping[str, Callable[[Steps, Node], None]]


def read_routines(
    node: Node, faults: list[Fault], readers: Readers, path: str, routines: Routines
) -> None:
    """Read and verify every routine; later ones may call earlier ones."""
    for name, value in (node.mapping(faults) or {}).items():
        place = node.key_place(name)
        if not NAME.fullmatch(name) or name in RESERVED:
            faults.append(Fault(place, "name", f"'{name[:60]}' cannot name a routine"))
            continue
        try:
            routine = _routine(name, value, place, faults, readers, path, routines)
        except InputError as error:
            faults.extend(error.faults)
            routine = None
        if routine is None:
            routines.failed.add(name)
        else:
            routines.known[name] = routine


def _routine(
    name: str,
    node: Node,
    place: Place,
    faults: list[Fault],
    readers: Readers,
    path: str,
    routines: Routines,
) -> Routine | None:
    entries = node.mapping(faults, keys=_KEYS, required=("arguments", "steps"))
    if entries is None or not {"arguments", "steps"} <= set(entries):
        return None
    draft = Draft()
    names: dict[str, tuple[int, ...]] = {}
    widths: dict[str, int] = {}
    for key, item in (entries["arguments"].mapping(faults) or {}).items():
        width = 1
        if not item.is_null:
            width = item.whole(faults, low=1, high=WIDEST) or 1
        where = entries["arguments"].key_place(key)
        widths[key] = width
        names[key] = draft.add_register(key, width, "unknown", where)
    steps = Steps(draft, names, {}, faults, readers)
    steps.routines = routines
    routine = Routine(
        name,
        widths,
        entries.get("scratch"),
        entries.get("borrowed"),
        entries["steps"],
        None,
        place,
    )
    before = len(faults)
    lent: list[int] = []
    if routine.borrowed is not None:
        for key, item in (routine.borrowed.mapping(faults) or {}).items():
            width = item.whole(faults, low=1, high=WIDEST) or 1
            where = routine.borrowed.key_place(key)
            if key in names:
                faults.append(Fault(where, "declared-twice", f"'{key}' is an argument"))
            names[key] = draft.add_register(key, width, "unknown", where)
            lent += names[key]
    _body(steps, routine, names, is_alone=True)
    body = steps.out
    claim = _claim(steps, entries.get("computes"))
    if len(faults) > before:
        return None
    draft.steps = body
    program = assemble(draft, "yaml", "", path, name=name)
    check_claims(program)
    if routine.borrowed is not None:
        _verify_borrowed(program, lent, routine.borrowed)
    if claim is not None and claim.signature is not None:
        _verify(program, claim, claim.signature, name)
    return replace(routine, computes=claim)


def _claim(steps: Steps, node: Node | None) -> Step | None:
    """Return the call that a routine says it is."""
    if node is None:
        return None
    steps.out = []
    entries = node.mapping(steps.faults)
    if entries is None:
        return None
    for key, value in entries.items():
        reader = steps.readers.get(key)
        if reader is not None:
            reader(steps, value)
    found = [step for step in steps.out if step.signature is not None]
    if len(found) != 1 or len(steps.out) != 1 or len(entries) != 1:
        node.fault(
            steps.faults,
            "claim",
            "'computes' must be one arithmetic step on the arguments",
            "write it as a step, such as: computes: {add: {value: a, into: b}}",
        )
        return None
    return found[0]


def _verify_borrowed(program: Program, lent: Sequence[int], node: Node) -> None:
    """Refuse borrowed scratch that does not come back, or that others depend on."""
    first, second = Replay(program, frozenset()), Replay(program, frozenset())
    for wire in lent:
        second.bits[wire] = ~second.bits[wire]
    for op in program.operations:
        is_phase = op.kind in ("mcz", "mcp")
        is_other = op.kind == "gate" and op.name not in _PERMUTING
        if (is_phase or is_other) and set(op.wires) & {*lent}:
            raise InputError.at(
                op.place,
                "borrowed-claim",
                f"'{op.name}' acts on the borrowed {program.wire_names[op.wires[0]]}, "
                "so that it cannot be verified that it comes back",
                "use x, cx, swap, mcx and arithmetic on borrowed scratch",
            )
        first.run(op)
        second.run(op)
    for wire, name in enumerate(program.wire_names):
        before = first.inputs.get(wire)
        is_lent = wire in lent
        if is_lent and before is not None and (first.bits[wire] != before).any():
            what = f"the borrowed {name} does not come back as it was"
        elif not is_lent and (first.bits[wire] != second.bits[wire]).any():
            what = f"what {name} becomes depends on the borrowed scratch"
        else:
            continue
        raise InputError.at(
            node.place,
            "borrowed-claim",
            what,
            "toggle it back, or declare it as clean scratch",
        )


def _verify(program: Program, claim: Step, signature: Signature, name: str) -> None:
    """Refuse a claim that some input contradicts, or that cannot be followed."""
    for op in program.operations:
        is_bits = op.kind in ("mcx", "and", "barrier") or op.signature is not None
        if not is_bits and op.name not in _PERMUTING:
            raise InputError.at(
                op.place,
                "claim-not-verified",
                f"'{op.name}' in the routine '{name}' is no permutation of bits, so "
                f"that it cannot be verified that it computes '{claim.kind}'",
                "drop 'computes', or use x, cx, swap, mcx and arithmetic only",
            )
    replay = Replay(program, frozenset())
    for op in program.operations:
        replay.run(op)
    inputs = [_column(replay.inputs.get(w), SAMPLES) for w in claim.wires]
    outputs = [_column(replay.bits[w], SAMPLES) for w in claim.wires]
    widths = value_widths(signature)
    others = [
        (_column(replay.inputs[w], SAMPLES), _column(replay.bits[w], SAMPLES))
        for w in sorted(set(replay.inputs) - set(claim.wires))
    ]
    for sample in range(SAMPLES):
        values = numbers([column[sample] for column in inputs], widths)
        if not promised(signature, values):
            continue
        wanted = digits(apply(signature, values), widths)
        found = [column[sample] for column in outputs]
        kept = all(before[sample] == after[sample] for before, after in others)
        if found != wanted or not kept:
            got = numbers(found, widths)
            raise InputError.at(
                claim.place,
                "false-claim",
                f"the routine '{name}' does not compute '{claim.kind}': it makes {got} "
                f"of {values}, the claim says {numbers(wanted, widths)}"
                + ("" if kept else ", and changes another argument"),
                "numbers are those of the claim's wires in order: controls, registers, "
                "result",
            )


def _column(words: object, count: int) -> list[int]:
    if words is None:
        return [0] * count
    bits = np.unpackbits(np.asarray(words).view(np.uint8), bitorder="little")
    return [int(bit) for bit in bits]


def call(steps: Steps, node: Node) -> None:
    """Write a routine's steps out on the wires that it is given."""
    entries = node.mapping(
        steps.faults, keys=("routine", "with"), required=("routine",)
    )
    if entries is None or "routine" not in entries:
        return
    name = entries["routine"].text(steps.faults)
    routine = steps.routines.known.get(name or "")
    if routine is None and name in steps.routines.failed:
        return
    if routine is None:
        entries["routine"].fault(
            steps.faults,
            "undeclared",
            f"the routine '{name}' is not declared before its use",
            "declare it under 'routines', before the routines that call it",
        )
        return
    given = _arguments(steps, node, entries.get("with"), routine)
    if given is None:
        return
    if routine.computes is not None:
        _one_call(steps, node, routine, given)
        return
    _body(steps, routine, given)


def _arguments(
    steps: Steps, node: Node, with_node: Node | None, routine: Routine
) -> dict[str, tuple[int, ...]] | None:
    keys = tuple(routine.arguments)
    before = len(steps.faults)
    entries: Mapping[str, Node] = {}
    if with_node is not None:
        entries = with_node.mapping(steps.faults, keys=keys, required=keys) or {}
    elif keys:
        node.fault(steps.faults, "missing-key", f"the call needs 'with': {keys}")
    if len(steps.faults) > before:
        return None
    given: dict[str, tuple[int, ...]] = {}
    seen: set[int] = set()
    for key, item in entries.items():
        wires = tuple(w for part in steps.plain(item) for w in part.wires)
        if len(wires) != routine.arguments[key]:
            item.fault(
                steps.faults,
                "width",
                f"the argument '{key}' of '{routine.name}' has width "
                f"{routine.arguments[key]}, found {len(wires)}",
            )
        if seen & set(wires):
            item.fault(
                steps.faults, "same-qubit", f"'{key}' gets a qubit that is given twice"
            )
        seen |= set(wires)
        given[key] = wires
    return given if len(steps.faults) == before else None


def _one_call(
    steps: Steps, node: Node, routine: Routine, given: Mapping[str, tuple[int, ...]]
) -> None:
    claim = routine.computes
    if claim is None:
        return
    # Arguments were given the first wires of the routine's own draft, in order.
    flat = [wire for key in routine.arguments for wire in given[key]]
    wires = [flat[w] for w in claim.wires]
    steps.add(claim.kind, wires, node.place, signature=claim.signature)


def _body(
    steps: Steps,
    routine: Routine,
    given: Mapping[str, tuple[int, ...]],
    *,
    is_alone: bool = False,
) -> None:
    """Read the steps of a routine, in a scope that owns its scratch.

    Alone, borrowed scratch is among the wires given, and may hold anything.
    """
    number = len(steps.draft.scopes)
    parent, part = steps.open[-1] if steps.open else (-1, "")
    name = routine.name
    steps.draft.scopes.append(DraftScope(number, parent, part, name, routine.place))
    saved, bits = steps.names, steps.bits
    steps.names, steps.bits = dict(given), {}
    try:
        if routine.scratch is not None:
            add_workspace(steps, routine.scratch, number)
        if routine.borrowed is not None and not is_alone:
            add_workspace(steps, routine.borrowed, number)
        steps.out.extend(read_part(steps, number, "body", routine.steps))
    finally:
        steps.names, steps.bits = saved, bits
