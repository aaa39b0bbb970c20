"""Makers of additions: from a signature to a draft with its slots.

In: a signature with at most the controls that the recipe knows itself.  Out: `Made`.
Which recipe exists for which signature is said in `ways.py`.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from placer.program.signature import Layout, Signature, layout
from placer.recipes import (
    ands,
    constants,
    divide,
    fourier,
    increments,
    lookahead,
    prefixes,
    ripple,
)
from placer.recipes.ands import Cleaner
from placer.recipes.draft import Draft, Made, both, join, same
from placer.recipes.toffoli import temporary_and

Maker = Callable[[Signature], Made]


def fresh_wires(place: Layout, count: int) -> list[int]:
    """Return the first so many slots."""
    return list(range(place.first_slot, place.first_slot + count))


def control_of(place: Layout) -> int | None:
    """Return the control of a call that has at most one."""
    return place.controls[0] if place.controls else None


def turned(draft: Draft, wires: Sequence[int]) -> Draft:
    """Return a draft between X gates on some wires: addition becomes subtraction."""
    frame = join(both("x", wire) for wire in wires)
    return join((frame, draft, frame))


def directed(signature: Signature, draft: Draft) -> Draft:
    """Return an addition, or its mirror image if a subtraction is asked for."""
    return draft.inverse() if signature.is_backward else draft


# ------------------------------------------------------------------ add
def add_ripple_one(signature: Signature) -> Made:
    """Return the ripple adder on one clean wire."""
    place = layout(signature)
    a, b = place.registers
    control = control_of(place)
    if control is None:
        draft = ripple.one_clean(a, b, place.result, place.first_slot)
    else:
        draft = ripple.one_clean_if(control, a, b, place.result, place.first_slot)
    return Made(directed(signature, draft), ("clean",))


def add_ripple_one_short(signature: Signature) -> Made:
    """Return the ripple adder of half the depth on one clean wire."""
    place = layout(signature)
    a, b = place.registers
    assert place.result is not None
    draft = ripple.one_clean_short(a, b, place.result, place.first_slot)
    return Made(directed(signature, draft), ("clean",))


def add_ripple_none(signature: Signature) -> Made:
    """Return the ripple adder without workspace."""
    place = layout(signature)
    a, b = place.registers
    control = control_of(place)
    if control is None:
        draft = ripple.no_workspace(a, b, place.result)
    else:
        draft = ripple.no_workspace_if(control, a, b)
    return Made(directed(signature, draft))


def add_lookahead(signature: Signature, *, measured: bool) -> Made:
    """Return the look-ahead adder; a control first masks A into clean wires."""
    place = layout(signature)
    a, b = place.registers
    size, control = len(a), control_of(place)
    need = lookahead.in_place_clean(size, carry=signature.carry)
    mask = 0 if control is None else size
    fresh, cleaner = fresh_wires(place, need + mask), Cleaner(measured)
    if control is None:
        draft = lookahead.in_place(a, b, place.result, fresh, cleaner)
    else:
        masked = fresh[need:]
        pairs = list(zip(a, masked, strict=True))
        copy = [temporary_and(control, wire, copied) for wire, copied in pairs]
        inner = lookahead.in_place(masked, b, place.result, fresh[:need], cleaner)
        drop = [cleaner.undo(control, wire, copied) for wire, copied in pairs]
        draft = join((*copy, inner, *drop))
    if signature.is_backward:
        draft = turned(draft, b) if measured else draft.inverse()
    return Made(draft, same("clean", need + mask), cleaner.bits)


def add_ands(signature: Signature, *, measured: bool) -> Made:
    """Return the adder by temporary ANDs."""
    place = layout(signature)
    a, b = place.registers
    control = control_of(place)
    need = len(a) - (not signature.carry) + (control is not None)
    cleaner, fresh = Cleaner(measured), fresh_wires(place, need)
    if control is None:
        draft = ands.add(a, b, place.result, fresh, cleaner)
    else:
        draft = ands.add_if(control, a, b, place.result, fresh, cleaner)
    if signature.is_backward:
        draft = turned(draft, b) if measured else draft.inverse()
    return Made(draft, same("clean", need), cleaner.bits)


def add_fourier(signature: Signature) -> Made:
    """Return the adder in the Fourier basis."""
    place = layout(signature)
    draft = fourier.add(place.registers[0], place.target, control_of(place))
    return Made(directed(signature, draft))


# ------------------------------------------------------------------ sum
def sum_lookahead(signature: Signature) -> Made:
    """Return the look-ahead sum of two registers in a third."""
    place = layout(signature)
    a, b, _ = place.registers
    need = lookahead.out_of_place_clean(len(place.target) - 1)
    cleaner, fresh = Cleaner(measured=False), fresh_wires(place, need)
    draft = lookahead.out_of_place(a, b, place.target, fresh, cleaner)
    return Made(directed(signature, draft), same("clean", need))


def sum_ands(signature: Signature, *, measured: bool) -> Made:
    """Return the sum by ANDs whose wires become the sum, or the way back."""
    place = layout(signature)
    a, b, _ = place.registers
    if not signature.inverse:
        return Made(ands.total(a, b, place.target))
    cleaner = Cleaner(measured)
    draft = ands.take_total(a, b, place.target, cleaner)
    return Made(draft, bits=cleaner.bits)


# ------------------------------------------------------------------ constants
def _odd_part(signature: Signature, place: Layout) -> tuple[Sequence[int], int]:
    """Return the wires that a constant changes and the constant without low zeros."""
    wires = place.target
    constant = 1 if signature.constant is None else signature.constant
    if not constant:
        return (), 0
    zeros = constants.trailing_zeros(constant)
    return wires[zeros:], constant >> zeros


def constant_clean(signature: Signature, *, measured: bool) -> Made:
    """Return a constant or 1 added by a ladder of carries on clean wires."""
    place = layout(signature)
    wires, odd = _odd_part(signature, place)
    if not wires:
        return Made(Draft())
    need = constants.clean_need(len(wires), signature.controls, held=measured)
    cleaner = Cleaner(measured)
    draft = constants.add_clean(
        wires, odd, fresh_wires(place, need), cleaner, place.controls
    )
    if signature.is_backward:
        draft = turned(draft, place.target) if measured else draft.inverse()
    return Made(draft, same("clean", need), cleaner.bits)


def constant_loaded(signature: Signature, *, measured: bool) -> Made:
    """Return a constant written into clean wires, added, and taken out again."""
    place = layout(signature)
    wires, odd = _odd_part(signature, place)
    if not wires:
        return Made(Draft())
    size, cleaner = len(wires), Cleaner(measured)
    need = 2 * size - 1 if measured else size
    fresh = fresh_wires(place, need)
    load = constants.load(odd, fresh[:size], place.controls)
    if measured:
        inner = ands.add(fresh[:size], wires, None, fresh[size:], cleaner)
    else:
        inner = ripple.no_workspace(fresh[:size], wires, None)
    draft = join((load, inner, load.inverse()))
    if signature.is_backward:
        draft = turned(draft, wires) if measured else draft.inverse()
    return Made(draft, same("clean", need), cleaner.bits)


def constant_borrowed(signature: Signature) -> Made:
    """Return a constant added by halves that lend to one another, one borrowed."""
    place = layout(signature)
    constant = signature.constant or 0
    draft = divide.add_constant(
        place.target, constant, place.first_slot, place.controls
    )
    return Made(directed(signature, draft), ("borrowed",))


def constant_fourier(signature: Signature) -> Made:
    """Return a constant or 1 added in the Fourier basis."""
    place = layout(signature)
    constant = 1 if signature.constant is None else signature.constant
    draft = fourier.add_constant(constant, place.target, place.controls)
    return Made(directed(signature, draft))


# ------------------------------------------------------------------ increments
def increment_borrowed(signature: Signature, form: str) -> Made:
    """Return 1 added on borrowed wires; a control is the lowest bit of a longer number.

    `form` is one of all, short, one.
    """
    place = layout(signature)
    wires = (*place.controls, *place.target)
    size = len(wires)
    count = {"all": size, "short": size - 1, "one": 1}[form]
    fresh = fresh_wires(place, count)
    if form == "all":
        draft = increments.many_borrowed(wires, fresh)
    elif form == "short":
        draft = increments.fewer_borrowed(wires, fresh)
    else:
        draft = increments.one_borrowed(wires, fresh[0])
    draft = join((draft, *(both("x", wire) for wire in place.controls)))
    return Made(directed(signature, draft), same("borrowed", count))


def increment_log(signature: Signature) -> Made:
    """Return 1 added on about lg n clean wires; a control is the lowest bit."""
    place = layout(signature)
    wires = (*place.controls, *place.target)
    need = prefixes.prefix_clean(len(wires) - 1)
    draft = prefixes.increment(wires, fresh_wires(place, need))
    draft = join((draft, *(both("x", wire) for wire in place.controls)))
    return Made(directed(signature, draft), same("clean", need))


def increment_none(signature: Signature) -> Made:
    """Return 1 added to at most three wires, controls included, by a cascade."""
    place = layout(signature)
    wires = (*place.controls, *place.target)
    draft = increments.cascade(wires, ())
    draft = join((draft, *(both("x", wire) for wire in place.controls)))
    return Made(directed(signature, draft))
