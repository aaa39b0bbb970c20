"""The arithmetic part of the catalog: which recipes exist, and each made concrete.

In: a signature.  Out: names in a fixed order, and `Built` circuits at both gate levels.
`smallest` and `largest` of these recipes bound `Signature.width`.  Comparisons for
equality reuse the multi-controlled X of `catalog.py`.  What a recipe costs on a device
is not asked.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import lru_cache

from placer.program.signature import Signature, layout, problems
from placer.recipes import catalog
from placer.recipes.ands import Cleaner
from placer.recipes.circuit import Built, Circuit, Op, Recipe
from placer.recipes.constants import bit
from placer.recipes.draft import Draft, Made, both, join, same, tidy
from placer.recipes.makers import turned
from placer.recipes.toffoli import temporary_and
from placer.recipes.way import Way
from placer.recipes.ways import WAYS, swap_way, taken_way

_BY_NAME = {way.recipe.name: way for way in WAYS}
_EQUAL = "equal-"
_PLAIN = "cnot"
"""The multi-controlled X of one control."""


def recipe_names(signature: Signature) -> tuple[str, ...]:
    """Return every recipe for a call, in the order of the catalog.

    Raises
    ------
    ValueError
        If the signature has no meaning.

    Examples
    --------
    >>> recipe_names(Signature("add", (1, 1)))
    ('add-ripple-one', 'add-ripple-none', 'add-fourier')
    """
    _refuse(signature)
    if signature.kind == "equal":
        return tuple(_EQUAL + name for name in _equal_names(signature))
    ways = list(WAYS)
    if signature.kind == "lookup":
        ways += _block_ways(len(signature.table))
    return tuple(way.recipe.name for way in ways if way.exists(signature))


def describe(name: str) -> Recipe:
    """Return what the catalog says about a recipe.

    Raises
    ------
    ValueError
        If there is no such recipe.
    """
    if name.startswith(_EQUAL):
        return _describe_equal(name)
    return _way(name).recipe


@lru_cache(maxsize=1024)
def build(name: str, signature: Signature) -> Built:
    """Return a recipe made concrete for one call.

    Operands come in the order of `Signature`, then one wire per slot.

    Raises
    ------
    ValueError
        If the signature has no meaning or the recipe does not exist for it.

    Examples
    --------
    >>> built = build("add-ripple-none", Signature("add", (8, 8), carry=True))
    >>> sum(op.name == "ccx" for op in built.coarse.ops), built.slots
    (15, ())
    """
    _refuse(signature)
    recipe = describe(name)
    if name not in recipe_names(signature):
        raise ValueError(f"recipe {name} does not build {signature}")
    if signature.kind == "equal":
        made = _equal(signature, name.removeprefix(_EQUAL))
    else:
        made = _make(_way(name), signature)
    operands = signature.operands
    draft = Draft(tidy(made.draft.coarse), tidy(made.draft.fine))
    made = _without_idle_slots(replace(made, draft=draft), operands)
    return Built(
        recipe=name,
        kind=signature.kind,
        controls=signature.controls,
        workspace=recipe.workspace,
        needs_measurement=recipe.needs_measurement,
        coarse=Circuit(operands, made.slots, made.draft.coarse, made.bits),
        fine=Circuit(operands, made.slots, made.draft.fine, made.bits),
        level2_wires=made.level2_wires,
    )


def _refuse(signature: Signature) -> None:
    wrong = problems(signature)
    if wrong:
        raise ValueError("; ".join(wrong))


def _way(name: str) -> Way:
    if name in _BY_NAME:
        return _BY_NAME[name]
    for way in _block_ways(1 << 64):
        if way.recipe.name == name:
            return way
    raise ValueError(f"there is no recipe {name!r}")


@lru_cache(maxsize=64)
def _block_ways(entries: int) -> tuple[Way, ...]:
    """Return the look-ups in blocks for a table, by block size, a power of two."""
    sizes = [1 << level for level in range(1, (entries // 2).bit_length())]
    swaps = tuple(
        swap_way(size, lent=lent, measured=measured)
        for lent in (False, True)
        for size in sizes
        for measured in (False, True)
    )
    return swaps + tuple(taken_way(size) for size in (1, *sizes))


# ------------------------------------------------------------------ wires
def rewire(draft: Draft, wires: Sequence[int]) -> Draft:
    """Return a draft whose wire i is `wires[i]`."""

    def onto(old: tuple[int, ...]) -> tuple[int, ...]:
        return tuple([wires[wire] for wire in old])

    def moved(ops: tuple[Op, ...]) -> tuple[Op, ...]:
        return tuple(
            Op(
                op.name,
                onto(op.wires),
                op.params,
                op.bit,
                op.condition,
                op.level,
                op.action,
                onto(op.enters),
                onto(op.leaves),
            )
            for op in ops
        )

    return Draft(moved(draft.coarse), moved(draft.fine))


def _without_idle_slots(made: Made, operands: int) -> Made:
    """Return what was made without slots that no gate touches."""
    draft = made.draft
    touched = {wire for op in (*draft.coarse, *draft.fine) for wire in op.wires}
    kept = [at for at in range(len(made.slots)) if operands + at in touched]
    if len(kept) == len(made.slots):
        return made
    wires = list(range(operands + len(made.slots)))
    for to, at in enumerate(kept):
        wires[operands + at] = operands + to
    slots = tuple(made.slots[at] for at in kept)
    return replace(made, draft=rewire(draft, wires), slots=slots)


def _make(way: Way, signature: Signature) -> Made:
    """Return a call; controls beyond what the maker knows are held as a product."""
    if way.controls is None or signature.controls <= way.controls:
        return way.make(signature)
    inner = way.make(replace(signature, controls=1))
    if inner.draft == Draft():
        return inner
    count = signature.controls - 1
    first, place = signature.operands, layout(signature)
    cleaner = Cleaner(way.recipe.needs_measurement)
    cleaner.skip(inner.bits)
    up: list[Draft] = []
    down: list[Draft] = []
    held = place.controls[0]
    for control, holder in zip(
        place.controls[1:], range(first, first + count), strict=True
    ):
        up.append(temporary_and(held, control, holder))
        down.insert(0, cleaner.undo(held, control, holder))
        held = holder
    operands = range(signature.controls, signature.operands)
    after = range(first + count, first + count + len(inner.slots))
    middle = rewire(inner.draft, [held, *operands, *after])
    slots = same("clean", count) + inner.slots
    return Made(join((*up, middle, *down)), slots, cleaner.bits)


# ------------------------------------------------------------------ equality
def _factors(signature: Signature) -> int:
    return signature.controls + signature.widths[0]


def _equal_names(signature: Signature) -> tuple[str, ...]:
    if _factors(signature) == 1:
        return (_PLAIN,)
    return catalog.recipe_names("mcx", _factors(signature))


def _describe_equal(name: str) -> Recipe:
    inner = name.removeprefix(_EQUAL)
    if inner == _PLAIN:
        return Recipe(
            name, "comparison of one bit", ("equal",), "none", 1, 1, False, "definition"
        )
    recipe = catalog.describe(inner)
    if "mcx" not in recipe.kinds:
        raise ValueError(f"there is no recipe {name!r}")
    # The controls of the call are factors as well, so that one bit may be enough.
    title = f"bits compared, then: {recipe.title}"
    return replace(recipe, name=name, title=title, kinds=("equal",), smallest=1)


def _equal(signature: Signature, inner: str) -> Made:
    """Return result ^= [A = B] by one multi-controlled X on the compared bits."""
    place = layout(signature)
    compared = place.registers[-1]
    if signature.constant is None:
        frame = join(
            both("cx", one, other)
            for one, other in zip(place.registers[0], compared, strict=True)
        )
        zeros = list(compared)
    else:
        constant = signature.constant
        zeros = [wire for at, wire in enumerate(compared) if not bit(constant, at)]
        frame = Draft()
    assert place.result is not None
    factors = [*place.controls, *compared]
    if inner == _PLAIN:
        made = Made(both("cx", factors[0], place.result))
    else:
        made = _call(inner, len(factors), [*factors, place.result], place.first_slot)
    draft = turned(made.draft, zeros)
    return replace(made, draft=join((frame, draft, frame.inverse())))


def _call(name: str, controls: int, wires: list[int], first_slot: int) -> Made:
    """Return a multi-controlled X of the catalog on other wires."""
    built = catalog.build(name, "mcx", controls)
    slots = range(first_slot, first_slot + len(built.slots))
    onto = [*wires, *slots]
    draft = rewire(Draft(built.coarse.ops, built.fine.ops), onto)
    level2 = tuple(onto[wire] for wire in built.level2_wires)
    return Made(draft, built.slots, built.fine.bits, level2_wires=level2)
