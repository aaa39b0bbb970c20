"""Makers: from a signature to a draft with its slots, one function a recipe.

In: a signature with at most the controls that the recipe knows itself.  Out: `Made`.
Which recipe exists for which signature is said in `arithmetic.py`.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from placer.recipes import (
    ands,
    constants,
    divide,
    fourier,
    increments,
    lookahead,
    lookups,
    multiply,
    ripple,
)
from placer.recipes.ands import Cleaner
from placer.recipes.circuit import SlotKind
from placer.recipes.draft import Draft, Made, both, join, same
from placer.recipes.signature import Layout, Signature, layout
from placer.recipes.toffoli import temporary_and

Maker = Callable[[Signature], Made]


def _fresh(place: Layout, count: int) -> list[int]:
    return list(range(place.first_slot, place.first_slot + count))


def _control(place: Layout) -> int | None:
    return place.controls[0] if place.controls else None


def turned(draft: Draft, wires: Sequence[int]) -> Draft:
    """Return a draft between X gates on some wires: addition becomes subtraction."""
    frame = join(both("x", wire) for wire in wires)
    return join((frame, draft, frame))


def _directed(signature: Signature, draft: Draft) -> Draft:
    """Return an addition, or its mirror image if a subtraction is asked for."""
    return draft.inverse() if signature.is_backward else draft


# ------------------------------------------------------------------ add
def add_ripple_one(signature: Signature) -> Made:
    """Return the ripple adder on one clean wire."""
    place = layout(signature)
    a, b = place.registers
    control = _control(place)
    if control is None:
        draft = ripple.one_clean(a, b, place.result, place.first_slot)
    else:
        draft = ripple.one_clean_if(control, a, b, place.result, place.first_slot)
    return Made(_directed(signature, draft), ("clean",))


def add_ripple_one_short(signature: Signature) -> Made:
    """Return the ripple adder of half the depth on one clean wire."""
    place = layout(signature)
    a, b = place.registers
    assert place.result is not None
    draft = ripple.one_clean_short(a, b, place.result, place.first_slot)
    return Made(_directed(signature, draft), ("clean",))


def add_ripple_none(signature: Signature) -> Made:
    """Return the ripple adder without workspace."""
    place = layout(signature)
    a, b = place.registers
    control = _control(place)
    if control is None:
        draft = ripple.no_workspace(a, b, place.result)
    else:
        draft = ripple.no_workspace_if(control, a, b)
    return Made(_directed(signature, draft))


def add_lookahead(signature: Signature, *, measured: bool) -> Made:
    """Return the look-ahead adder; a control first masks A into clean wires."""
    place = layout(signature)
    a, b = place.registers
    size, control = len(a), _control(place)
    need = lookahead.in_place_clean(size, carry=signature.carry)
    mask = 0 if control is None else size
    fresh, cleaner = _fresh(place, need + mask), Cleaner(measured)
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
    control = _control(place)
    need = len(a) - (not signature.carry) + (control is not None)
    cleaner, fresh = Cleaner(measured), _fresh(place, need)
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
    draft = fourier.add(place.registers[0], place.target, _control(place))
    return Made(_directed(signature, draft))


# ------------------------------------------------------------------ sum
def sum_lookahead(signature: Signature) -> Made:
    """Return the look-ahead sum of two registers in a third."""
    place = layout(signature)
    a, b, _ = place.registers
    need = lookahead.out_of_place_clean(len(place.target) - 1)
    cleaner, fresh = Cleaner(measured=False), _fresh(place, need)
    draft = lookahead.out_of_place(a, b, place.target, fresh, cleaner)
    return Made(_directed(signature, draft), same("clean", need))


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
        wires, odd, _fresh(place, need), cleaner, place.controls
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
    fresh = _fresh(place, need)
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
    return Made(_directed(signature, draft), ("borrowed",))


def constant_fourier(signature: Signature) -> Made:
    """Return a constant or 1 added in the Fourier basis."""
    place = layout(signature)
    constant = 1 if signature.constant is None else signature.constant
    draft = fourier.add_constant(constant, place.target, place.controls)
    return Made(_directed(signature, draft))


# ------------------------------------------------------------------ increments
def increment_borrowed(signature: Signature, form: str) -> Made:
    """Return 1 added on borrowed wires; a control is the lowest bit of a longer number.

    `form` is one of all, short, one.
    """
    place = layout(signature)
    wires = (*place.controls, *place.target)
    size = len(wires)
    count = {"all": size, "short": size - 1, "one": 1}[form]
    fresh = _fresh(place, count)
    if form == "all":
        draft = increments.many_borrowed(wires, fresh)
    elif form == "short":
        draft = increments.fewer_borrowed(wires, fresh)
    else:
        draft = increments.one_borrowed(wires, fresh[0])
    draft = join((draft, *(both("x", wire) for wire in place.controls)))
    return Made(_directed(signature, draft), same("borrowed", count))


def increment_none(signature: Signature) -> Made:
    """Return 1 added to at most three wires, controls included, by a cascade."""
    place = layout(signature)
    wires = (*place.controls, *place.target)
    draft = increments.cascade(wires, ())
    draft = join((draft, *(both("x", wire) for wire in place.controls)))
    return Made(_directed(signature, draft))


# ------------------------------------------------------------------ comparators
def _result(place: Layout) -> int:
    assert place.result is not None
    return place.result


def compare_ripple_none(signature: Signature) -> Made:
    """Return [A < B] without workspace: the carry of NOT A + B."""
    place = layout(signature)
    a, b = place.registers
    return Made(turned(ripple.carry_out(a, b, _result(place)), a))


def compare_ripple_one(signature: Signature) -> Made:
    """Return [A < B] on one clean wire."""
    place = layout(signature)
    a, b = place.registers
    draft = ripple.carry_out_one_clean(
        a, b, _result(place), place.first_slot, _control(place)
    )
    return Made(turned(draft, a), ("clean",))


def compare_ands(signature: Signature, *, measured: bool) -> Made:
    """Return [A < B] by ANDs in n clean wires, one more with a control."""
    place = layout(signature)
    a, b = place.registers
    control = _control(place)
    need = len(a) + (control is not None)
    cleaner = Cleaner(measured)
    draft = ands.carry_out(a, b, _result(place), _fresh(place, need), cleaner, control)
    return Made(turned(draft, a), same("clean", need), cleaner.bits)


def compare_lookahead(signature: Signature) -> Made:
    """Return [A < B] in logarithmic depth on clean wires."""
    place = layout(signature)
    a, b = place.registers
    need = lookahead.top_carry_clean(len(a))
    draft = lookahead.top_carry(
        a, b, _result(place), _fresh(place, need), _control(place)
    )
    return Made(turned(draft, a), same("clean", need))


def _not_below(signature: Signature, place: Layout) -> constants.Chain | None:
    """Return [A >= constant] as a chain: the carry of A + (2^n - constant)."""
    wires = place.registers[0]
    lift = ((1 << len(wires)) - (signature.constant or 0)) % (1 << len(wires))
    if not lift:
        return None
    zeros = constants.trailing_zeros(lift)
    return constants.carry_chain(wires[zeros:], lift >> zeros, place.controls)


def _always(signature: Signature, place: Layout) -> Draft:
    """Return the flip of the result under the controls alone, at most one."""
    name = "cx" if signature.controls else "x"
    return both(name, *place.controls, _result(place))


def compare_constant_borrowed(signature: Signature) -> Made:
    """Return [A < constant] on borrowed wires, by a chain run twice."""
    place = layout(signature)
    chain = _not_below(signature, place)
    flip = _always(signature, place)
    if chain is None:
        return Made(flip if signature.constant else Draft())
    need = constants.borrowed_need(chain)
    draft = constants.product_borrowed(chain, _result(place), _fresh(place, need))
    return Made(draft + flip, same("borrowed", need))


def compare_constant_clean(signature: Signature, *, measured: bool) -> Made:
    """Return [A < constant] on clean wires, by a ladder."""
    place = layout(signature)
    chain = _not_below(signature, place)
    flip = _always(signature, place)
    if chain is None:
        return Made(flip if signature.constant else Draft())
    need = max(0, len(chain.factors) - (1 if measured else 2))
    cleaner = Cleaner(measured)
    draft = constants.product_clean(chain, _result(place), _fresh(place, need), cleaner)
    return Made(draft + flip, same("clean", need), cleaner.bits)


# ------------------------------------------------------------------ look-ups
def lookup_unary(signature: Signature, *, measured: bool) -> Made:
    """Return a look-up by unary iteration."""
    place = layout(signature)
    address, output = place.registers
    control, cleaner = _control(place), Cleaner(measured)
    entries = len(signature.table)
    need = lookups.unary_need(entries, controlled=control is not None)
    leaf = lookups.table_leaf(signature.table, output)
    fresh = _fresh(place, need)
    draft = lookups.unary(address, entries, leaf, fresh, cleaner, control)
    return Made(draft, same("clean", need), cleaner.bits)


def lookup_swap(signature: Signature, size: int, *, lent: bool, measured: bool) -> Made:
    """Return a look-up of blocks of `size` words, swapped to the front."""
    place = layout(signature)
    address, output = place.registers
    control, cleaner = _control(place), Cleaner(measured)
    entries = -(-len(signature.table) // size)
    need = lookups.unary_need(entries, controlled=control is not None)
    width = len(output)
    fresh = _fresh(place, need + size * width)
    words = [fresh[need + at * width : need + (at + 1) * width] for at in range(size)]
    make = lookups.select_swap_borrowed if lent else lookups.select_swap_clean
    draft = make(
        address, output, signature.table, words, fresh[:need], cleaner, control
    )
    kind: SlotKind = "borrowed" if lent else "clean"
    slots = same("clean", need) + same(kind, size * width)
    return Made(draft, slots, cleaner.bits)


# ------------------------------------------------------------------ products
def _multiply(
    signature: Signature,
    slots: int,
    cleaner: Cleaner,
    add_if: Callable[[Layout, list[int]], multiply.AddIf],
) -> Made:
    """Return a product by controlled additions that take so many slots of their own."""
    place = layout(signature)
    first, second, target = place.registers
    pad = multiply.padding((len(first), len(second), len(target)))
    control = _control(place)
    need = pad + slots + (control is not None)
    fresh = _fresh(place, need)
    step = add_if(place, fresh[pad : pad + slots])
    step = multiply.under(control, fresh[-1] if fresh else 0, step, cleaner)
    draft = multiply.multiply_add(first, second, target, fresh[:pad], step)
    if signature.is_backward:
        draft = turned(draft, target) if cleaner.measured else draft.inverse()
    return Made(draft, same("clean", need), cleaner.bits)


def multiply_ripple(signature: Signature, *, clean: bool) -> Made:
    """Return a product by controlled ripple additions, with one clean wire or none."""

    def add_if(_: Layout, fresh: list[int]) -> multiply.AddIf:
        if clean:
            return lambda wire, a, b: ripple.one_clean_if(wire, a, b, None, fresh[0])
        return ripple.no_workspace_if

    return _multiply(signature, int(clean), Cleaner(measured=False), add_if)


def multiply_ands(signature: Signature, *, measured: bool) -> Made:
    """Return a product by controlled additions of temporary ANDs."""
    cleaner = Cleaner(measured)

    def add_if(_: Layout, fresh: list[int]) -> multiply.AddIf:
        return lambda wire, a, b: ands.add_if(wire, a, b, None, fresh, cleaner)

    return _multiply(signature, signature.width, cleaner, add_if)


def multiply_fourier(signature: Signature) -> Made:
    """Return a product in the Fourier basis: a phase for every pair of bits."""
    first, second, target = layout(signature).registers
    draft = fourier.multiply_add(first, second, target)
    return Made(_directed(signature, draft))
