"""The table of arithmetic recipes: name, workspace, sizes, source, maker.

In: nothing.  Out: `WAYS` in the order of the catalog, and `swap_way` for the look-ups
whose names carry a block size.  `smallest` and `largest` of these recipes bound
`Signature.width`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial

from placer.recipes import makers
from placer.recipes.circuit import Recipe, Workspace
from placer.recipes.makers import Maker
from placer.recipes.signature import Signature

Fits = Callable[[Signature], bool]


@dataclass(frozen=True, slots=True)
class Way:
    """A recipe with its maker and with what it can do.

    `controls` is the most controls that the maker knows itself (`None`: any number).
    Recipes on clean wires take more: their product is held in further clean wires.
    """

    recipe: Recipe
    make: Maker
    fits: Fits
    controls: int | None

    def exists(self, signature: Signature) -> bool:
        """Whether the recipe builds this call."""
        recipe = self.recipe
        if signature.kind not in recipe.kinds or signature.width < recipe.smallest:
            return False
        if recipe.largest is not None and signature.width > recipe.largest:
            return False
        if self.controls is not None and signature.controls > self.controls:
            if recipe.workspace != "clean" or self.controls == 0:
                return False
            signature = replace(signature, controls=1)
        return self.fits(signature)


def _always(_: Signature) -> bool:
    return True


def _by_register(signature: Signature) -> bool:
    return signature.constant is None


def _way(
    name: str,
    title: str,
    workspace: Workspace,
    kinds: tuple[str, ...],
    make: Maker,
    source: str,
    *,
    fits: Fits = _always,
    controls: int | None = 1,
    sizes: tuple[int, int | None] = (1, None),
    measured: bool = False,
) -> Way:
    recipe = Recipe(name, title, kinds, workspace, *sizes, measured, source)
    return Way(recipe, make, fits, controls)


_ADD = ("add", "subtract")
_STEP = ("increment", "decrement")
_CUCCARO = "Cuccaro et al. 2004, quant-ph/0410184"
_TAKAHASHI = "Takahashi, Tani and Kunihiro 2009, arXiv 0910.2530"
_DRAPER = "Draper 2000, quant-ph/0008033"
_DKRS = "Draper, Kutin, Rains and Svore 2004, quant-ph/0406142"
_GIDNEY = "Gidney 2018, arXiv 1709.06648"
_CONTROLLED = "controlled after Munoz-Coreas and Thapliyal 2017, arXiv 1706.05113"
_HANER = "Haener, Roetteler and Svore 2016, arXiv 1611.07995"
_BORROWED = "Gidney 2015, Constructing large increment gates"
_LADDER = "common practice for 1, derived here for other constants"
_UNARY = "Babbush et al. 2018, arXiv 1805.03662"
_SWAP = "Low, Kliuchnikov and Schaeffer 2018, arXiv 1812.00954; Berry et al. 2019"
_LARGEST_FOURIER = 64
"""Beyond this the smallest phases are below the precision of any device."""


def _no_carry_if_controlled(signature: Signature) -> bool:
    return not (signature.controls and signature.carry)


def _short_ripple(signature: Signature) -> bool:
    return signature.carry and not signature.controls


def _few_wires(signature: Signature) -> bool:
    return signature.controls + signature.width + signature.carry <= 3


def _by_constant(signature: Signature) -> bool:
    return signature.constant is not None


def _needs_ands(signature: Signature) -> bool:
    return len(signature.table) + (signature.controls > 0) > 2


def _inverse_only(signature: Signature) -> bool:
    return signature.inverse and signature.width + signature.carry > 1


WAYS: tuple[Way, ...] = (
    _way(
        "add-ripple-one",
        "ripple carry on one clean wire",
        "clean",
        _ADD,
        makers.add_ripple_one,
        f"{_CUCCARO}; {_CONTROLLED}",
    ),
    _way(
        "add-ripple-one-short",
        "ripple carry of half the depth on one clean wire",
        "clean",
        _ADD,
        makers.add_ripple_one_short,
        _CUCCARO,
        fits=_short_ripple,
        controls=0,
        sizes=(4, None),
    ),
    _way(
        "add-ripple-none",
        "ripple carry without workspace",
        "none",
        _ADD,
        makers.add_ripple_none,
        f"{_TAKAHASHI}; controlled form derived here",
        fits=_no_carry_if_controlled,
    ),
    _way(
        "add-lookahead",
        "carry look-ahead in place on clean wires",
        "clean",
        _ADD,
        partial(makers.add_lookahead, measured=False),
        _DKRS,
        sizes=(2, None),
    ),
    _way(
        "add-lookahead-measured",
        "carry look-ahead in place on clean wires, cleaned by measurement",
        "clean",
        _ADD,
        partial(makers.add_lookahead, measured=True),
        f"{_DKRS}; {_GIDNEY}",
        sizes=(2, None),
        measured=True,
    ),
    _way(
        "add-ands-measured",
        "temporary ANDs on clean wires, cleaned by measurement",
        "clean",
        _ADD,
        partial(makers.add_ands, measured=True),
        _GIDNEY,
        sizes=(2, None),
        measured=True,
    ),
    _way(
        "add-ands-mirror",
        "temporary ANDs on clean wires and their mirror image",
        "clean",
        _ADD,
        partial(makers.add_ands, measured=False),
        _GIDNEY,
        sizes=(2, None),
    ),
    _way(
        "add-fourier",
        "phases in the Fourier basis, no workspace",
        "none",
        _ADD,
        makers.add_fourier,
        _DRAPER,
        sizes=(1, _LARGEST_FOURIER),
    ),
    _way(
        "sum-ands",
        "ANDs that become the sum, no workspace, and their mirror image",
        "none",
        ("sum",),
        partial(makers.sum_ands, measured=False),
        _GIDNEY,
        controls=0,
    ),
    _way(
        "sum-ands-measured",
        "sum taken away by measurement, no workspace",
        "none",
        ("sum",),
        partial(makers.sum_ands, measured=True),
        _GIDNEY,
        fits=_inverse_only,
        controls=0,
        measured=True,
    ),
    _way(
        "sum-lookahead",
        "carry look-ahead out of place on clean wires",
        "clean",
        ("sum",),
        makers.sum_lookahead,
        _DKRS,
        controls=0,
    ),
    _way(
        "constant-clean",
        "ladder of carries on n-3 clean wires",
        "clean",
        ("add_constant",),
        partial(makers.constant_clean, measured=False),
        _LADDER,
    ),
    _way(
        "constant-clean-measured",
        "ladder of carries on n-2 clean wires, cleaned by measurement",
        "clean",
        ("add_constant",),
        partial(makers.constant_clean, measured=True),
        f"{_LADDER}; {_GIDNEY}",
        measured=True,
    ),
    _way(
        "constant-loaded",
        "constant written into n clean wires, ripple carry",
        "clean",
        ("add_constant",),
        partial(makers.constant_loaded, measured=False),
        f"common practice; {_TAKAHASHI}",
    ),
    _way(
        "constant-loaded-measured",
        "constant written into clean wires, ANDs cleaned by measurement",
        "clean",
        ("add_constant",),
        partial(makers.constant_loaded, measured=True),
        f"common practice; {_GIDNEY}",
        measured=True,
    ),
    _way(
        "constant-borrowed",
        "halves that lend to one another, one borrowed wire",
        "borrowed",
        ("add_constant",),
        makers.constant_borrowed,
        f"{_HANER}; {_BORROWED}",
    ),
    _way(
        "constant-fourier",
        "phases in the Fourier basis, no workspace",
        "none",
        ("add_constant", *_STEP),
        makers.constant_fourier,
        f"{_DRAPER}; Beauregard 2003, quant-ph/0205095",
        controls=2,
        sizes=(1, _LARGEST_FOURIER),
    ),
    _way(
        "increment-none",
        "cascade of products on at most three wires",
        "none",
        _STEP,
        makers.increment_none,
        "common practice",
        fits=_few_wires,
    ),
    _way(
        "increment-clean",
        "ladder of products on n-3 clean wires",
        "clean",
        _STEP,
        partial(makers.constant_clean, measured=False),
        "common practice",
        controls=None,
    ),
    _way(
        "increment-clean-measured",
        "ladder of ANDs on n-2 clean wires, cleaned by measurement",
        "clean",
        _STEP,
        partial(makers.constant_clean, measured=True),
        _GIDNEY,
        controls=None,
        measured=True,
    ),
    _way(
        "increment-borrowed",
        "two subtractions of a number and its complement, n borrowed wires",
        "borrowed",
        _STEP,
        partial(makers.increment_borrowed, form="all"),
        f"{_BORROWED}; {_TAKAHASHI}",
    ),
    _way(
        "increment-borrowed-short",
        "two subtractions of a number and its complement, n-1 borrowed wires",
        "borrowed",
        _STEP,
        partial(makers.increment_borrowed, form="short"),
        f"{_BORROWED}; {_TAKAHASHI}; short form derived here",
    ),
    _way(
        "increment-borrowed-one",
        "halves that lend to one another, one borrowed wire",
        "borrowed",
        _STEP,
        partial(makers.increment_borrowed, form="one"),
        f"{_BORROWED}; {_HANER}",
    ),
    _way(
        "compare-ripple-none",
        "carry of the complement without workspace",
        "none",
        ("less_than",),
        makers.compare_ripple_none,
        _TAKAHASHI,
        fits=_by_register,
        controls=0,
    ),
    _way(
        "compare-ripple-one",
        "carry of the complement on one clean wire",
        "clean",
        ("less_than",),
        makers.compare_ripple_one,
        _CUCCARO,
        fits=_by_register,
    ),
    _way(
        "compare-lookahead",
        "carry of the complement in logarithmic depth on clean wires",
        "clean",
        ("less_than",),
        makers.compare_lookahead,
        f"after {_DKRS}; pairwise form derived here",
        fits=_by_register,
        sizes=(2, None),
    ),
    _way(
        "compare-ands-measured",
        "carry by ANDs on n clean wires, cleaned by measurement",
        "clean",
        ("less_than",),
        partial(makers.compare_ands, measured=True),
        _GIDNEY,
        fits=_by_register,
        measured=True,
    ),
    _way(
        "compare-ands-mirror",
        "carry by ANDs on n clean wires and their mirror image",
        "clean",
        ("less_than",),
        partial(makers.compare_ands, measured=False),
        _GIDNEY,
        fits=_by_register,
    ),
    _way(
        "compare-constant-clean",
        "carry against a constant by a ladder on n-2 clean wires",
        "clean",
        ("less_than",),
        partial(makers.compare_constant_clean, measured=False),
        _LADDER,
        fits=_by_constant,
    ),
    _way(
        "compare-constant-measured",
        "carry against a constant on n-1 clean wires, cleaned by measurement",
        "clean",
        ("less_than",),
        partial(makers.compare_constant_clean, measured=True),
        f"{_LADDER}; {_GIDNEY}",
        fits=_by_constant,
        measured=True,
    ),
    _way(
        "compare-constant-borrowed",
        "carry against a constant on n-2 borrowed wires",
        "borrowed",
        ("less_than",),
        makers.compare_constant_borrowed,
        _HANER,
        fits=_by_constant,
    ),
    _way(
        "lookup-unary",
        "unary iteration on clean wires",
        "clean",
        ("lookup",),
        partial(makers.lookup_unary, measured=False),
        _UNARY,
    ),
    _way(
        "lookup-unary-measured",
        "unary iteration on clean wires, cleaned by measurement",
        "clean",
        ("lookup",),
        partial(makers.lookup_unary, measured=True),
        _UNARY,
        fits=_needs_ands,
        measured=True,
    ),
    _way(
        "multiply-ripple-none",
        "controlled ripple additions",
        "clean",
        ("multiply_add",),
        partial(makers.multiply_ripple, clean=False),
        f"schoolbook; {_TAKAHASHI}",
    ),
    _way(
        "multiply-ripple-one",
        "controlled ripple additions on one clean wire",
        "clean",
        ("multiply_add",),
        partial(makers.multiply_ripple, clean=True),
        f"schoolbook; {_CUCCARO}; {_CONTROLLED}",
    ),
    _way(
        "multiply-ands-measured",
        "controlled additions by ANDs, cleaned by measurement",
        "clean",
        ("multiply_add",),
        partial(makers.multiply_ands, measured=True),
        f"schoolbook; {_GIDNEY}",
        measured=True,
    ),
    _way(
        "multiply-fourier",
        "a phase for every pair of bits in the Fourier basis",
        "none",
        ("multiply_add",),
        makers.multiply_fourier,
        "Ruiz-Perez and Garcia-Escartin 2017, arXiv 1411.5949",
        controls=0,
        sizes=(1, _LARGEST_FOURIER),
    ),
)


def swap_way(size: int, *, lent: bool, measured: bool) -> Way:
    """Return the select-swap look-up with so many words in a block."""
    kind: Workspace = "borrowed" if lent else "clean"
    suffix = "-measured" if measured else ""
    title = f"blocks of {size} words swapped to the front, {kind} words"
    return _way(
        f"lookup-swap-{kind}-{size}{suffix}",
        title + (", ANDs cleaned by measurement" if measured else ""),
        kind,
        ("lookup",),
        partial(makers.lookup_swap, size=size, lent=lent, measured=measured),
        _SWAP,
        fits=lambda signature: 2 * size <= len(signature.table),
        measured=measured,
    )
