"""Makers of comparisons, look-ups and products: from a signature to a draft with slots.

In: a signature with at most the controls that the recipe knows itself.  Out: `Made`.
Which recipe exists for which signature is said in `ways.py`.
"""

from __future__ import annotations

from collections.abc import Callable

from placer.program.signature import Layout, Signature, layout
from placer.recipes import (
    ands,
    constants,
    fourier,
    lookahead,
    lookups,
    multiply,
    prefixes,
    ripple,
    unlookups,
)
from placer.recipes.ands import Cleaner
from placer.recipes.circuit import SlotKind
from placer.recipes.draft import Draft, Made, both, same
from placer.recipes.makers import control_of, directed, fresh_wires, turned


# ------------------------------------------------------------------ comparators
def result_of(place: Layout) -> int:
    """Return the result wire of a comparison."""
    assert place.result is not None
    return place.result


def compare_ripple_none(signature: Signature) -> Made:
    """Return [A < B] without workspace: the carry of NOT A + B."""
    place = layout(signature)
    a, b = place.registers
    return Made(turned(ripple.carry_out(a, b, result_of(place)), a))


def compare_ripple_one(signature: Signature) -> Made:
    """Return [A < B] on one clean wire."""
    place = layout(signature)
    a, b = place.registers
    draft = ripple.carry_out_one_clean(
        a, b, result_of(place), place.first_slot, control_of(place)
    )
    return Made(turned(draft, a), ("clean",))


def compare_ands(signature: Signature, *, measured: bool) -> Made:
    """Return [A < B] by ANDs in n clean wires, one more with a control."""
    place = layout(signature)
    a, b = place.registers
    control = control_of(place)
    need = len(a) + (control is not None)
    cleaner = Cleaner(measured)
    draft = ands.carry_out(
        a, b, result_of(place), fresh_wires(place, need), cleaner, control
    )
    return Made(turned(draft, a), same("clean", need), cleaner.bits)


def compare_lookahead(signature: Signature) -> Made:
    """Return [A < B] in logarithmic depth on clean wires."""
    place = layout(signature)
    a, b = place.registers
    need = lookahead.top_carry_clean(len(a))
    draft = lookahead.top_carry(
        a, b, result_of(place), fresh_wires(place, need), control_of(place)
    )
    return Made(turned(draft, a), same("clean", need))


def compare_fourier(signature: Signature) -> Made:
    """Return [A < B] or [A < constant] as the borrow of a subtraction, taken back."""
    place = layout(signature)
    a = place.registers[0]
    longer = (*a, result_of(place))
    if signature.constant is None:
        control, b = control_of(place), place.registers[1]
        down = fourier.add(b, longer, control).inverse()
        return Made(down + fourier.add(b, a, control))
    value, controls = signature.constant, place.controls
    down = fourier.add_constant(-value, longer, controls)
    return Made(down + fourier.add_constant(value, a, controls))


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
    return both(name, *place.controls, result_of(place))


def compare_constant_borrowed(signature: Signature) -> Made:
    """Return [A < constant] on borrowed wires, by a chain run twice."""
    place = layout(signature)
    chain = _not_below(signature, place)
    flip = _always(signature, place)
    if chain is None:
        return Made(flip if signature.constant else Draft())
    need = constants.borrowed_need(chain)
    draft = constants.product_borrowed(
        chain, result_of(place), fresh_wires(place, need)
    )
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
    draft = constants.product_clean(
        chain, result_of(place), fresh_wires(place, need), cleaner
    )
    return Made(draft + flip, same("clean", need), cleaner.bits)


def compare_constant_log(signature: Signature) -> Made:
    """Return [A < constant] on about lg n clean wires."""
    place = layout(signature)
    wires, constant = place.registers[0], signature.constant or 0
    if not constant:
        return Made(Draft())
    if constant >> len(wires):
        return Made(_always(signature, place))
    length = prefixes.compared_length(len(wires), constant)
    need = prefixes.prefix_clean(length + signature.controls)
    draft = prefixes.below_constant(
        wires, constant, result_of(place), fresh_wires(place, need), place.controls
    )
    return Made(draft, same("clean", need))


# ------------------------------------------------------------------ look-ups
def lookup_unary(signature: Signature, *, measured: bool) -> Made:
    """Return a look-up by unary iteration."""
    place = layout(signature)
    address, output = place.registers
    control, cleaner = control_of(place), Cleaner(measured)
    entries = len(signature.table)
    need = lookups.unary_need(entries, controlled=control is not None)
    leaf = lookups.table_leaf(signature.table, output)
    fresh = fresh_wires(place, need)
    draft = lookups.unary(address, entries, leaf, fresh, cleaner, control)
    return Made(draft, same("clean", need), cleaner.bits)


def lookup_swap(signature: Signature, size: int, *, lent: bool, measured: bool) -> Made:
    """Return a look-up of blocks of `size` words, swapped to the front."""
    place = layout(signature)
    address, output = place.registers
    control, cleaner = control_of(place), Cleaner(measured)
    entries = -(-len(signature.table) // size)
    need = lookups.unary_need(entries, controlled=control is not None)
    width = len(output)
    fresh = fresh_wires(place, need + size * width)
    words = [fresh[need + at * width : need + (at + 1) * width] for at in range(size)]
    make = lookups.select_swap_borrowed if lent else lookups.select_swap_clean
    draft = make(
        address, output, signature.table, words, fresh[:need], cleaner, control
    )
    kind: SlotKind = "borrowed" if lent else "clean"
    slots = same("clean", need) + same(kind, size * width)
    return Made(draft, slots, cleaner.bits)


def lookup_taken(signature: Signature, size: int) -> Made:
    """Return the measured way to take a looked-up word away, by blocks of addresses."""
    place = layout(signature)
    address, output = place.registers
    control = control_of(place)
    entries, cleaner = len(signature.table), Cleaner(measured=True)
    cleaner.skip(len(output))
    need = unlookups.need(entries, size, controlled=control is not None)
    draft = unlookups.take_away(
        address,
        output,
        signature.table,
        size,
        fresh_wires(place, need),
        cleaner,
        control,
    )
    return Made(draft, same("clean", need), cleaner.bits)


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
    control = control_of(place)
    need = pad + slots + (control is not None)
    fresh = fresh_wires(place, need)
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
    return Made(directed(signature, draft))
