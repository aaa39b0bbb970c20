"""The table of arithmetic recipes: name, workspace, sizes, source, maker.

In: nothing.  Out: `WAYS` in the order of the catalog, and functions for the look-ups
whose names carry a block size.  `smallest` and `largest` of these recipes bound
`Signature.width`.
"""

from __future__ import annotations

from functools import partial

from placer.program.signature import Signature
from placer.recipes import further_makers
from placer.recipes.additions import ADDITIONS
from placer.recipes.circuit import Workspace
from placer.recipes.way import (
    CONTROLLED,
    CUCCARO,
    DKRS,
    DRAPER,
    GIDNEY,
    HANER,
    KHATTAR,
    LADDER,
    LARGEST_FOURIER,
    TAKAHASHI,
    Way,
    way,
)

_UNARY = "Babbush et al. 2018, arXiv 1805.03662"
_SWAP = "Low, Kliuchnikov and Schaeffer 2018, arXiv 1812.00954; Berry et al. 2019"


def _by_register(signature: Signature) -> bool:
    return signature.constant is None


def _by_constant(signature: Signature) -> bool:
    return signature.constant is not None


def _needs_ands(signature: Signature) -> bool:
    return len(signature.table) + (signature.controls > 0) > 2


WAYS: tuple[Way, ...] = (
    *ADDITIONS,
    way(
        "compare-ripple-none",
        "carry of the complement without workspace",
        "none",
        ("less_than",),
        further_makers.compare_ripple_none,
        TAKAHASHI,
        fits=_by_register,
        controls=0,
    ),
    way(
        "compare-ripple-one",
        "carry of the complement on one clean wire",
        "clean",
        ("less_than",),
        further_makers.compare_ripple_one,
        CUCCARO,
        fits=_by_register,
    ),
    way(
        "compare-lookahead",
        "carry of the complement in logarithmic depth on clean wires",
        "clean",
        ("less_than",),
        further_makers.compare_lookahead,
        f"after {DKRS}; pairwise form derived here",
        fits=_by_register,
        sizes=(2, None),
    ),
    way(
        "compare-ands-measured",
        "carry by ANDs on n clean wires, cleaned by measurement",
        "clean",
        ("less_than",),
        partial(further_makers.compare_ands, measured=True),
        GIDNEY,
        fits=_by_register,
        measured=True,
    ),
    way(
        "compare-ands-mirror",
        "carry by ANDs on n clean wires and their mirror image",
        "clean",
        ("less_than",),
        partial(further_makers.compare_ands, measured=False),
        GIDNEY,
        fits=_by_register,
    ),
    way(
        "compare-constant-clean",
        "carry against a constant by a ladder on n-2 clean wires",
        "clean",
        ("less_than",),
        partial(further_makers.compare_constant_clean, measured=False),
        LADDER,
        fits=_by_constant,
    ),
    way(
        "compare-constant-measured",
        "carry against a constant on n-1 clean wires, cleaned by measurement",
        "clean",
        ("less_than",),
        partial(further_makers.compare_constant_clean, measured=True),
        f"{LADDER}; {GIDNEY}",
        fits=_by_constant,
        measured=True,
    ),
    way(
        "compare-constant-log",
        "agreement from the top on about lg n clean wires",
        "clean",
        ("less_than",),
        further_makers.compare_constant_log,
        KHATTAR,
        fits=_by_constant,
        sizes=(2, None),
    ),
    way(
        "compare-constant-borrowed",
        "carry against a constant on n-2 borrowed wires",
        "borrowed",
        ("less_than",),
        further_makers.compare_constant_borrowed,
        HANER,
        fits=_by_constant,
    ),
    way(
        "compare-fourier",
        "borrow of a subtraction in the Fourier basis, no workspace",
        "none",
        ("less_than",),
        further_makers.compare_fourier,
        DRAPER,
        fits=_by_register,
        sizes=(1, LARGEST_FOURIER),
    ),
    way(
        "compare-constant-fourier",
        "borrow of a subtraction in the Fourier basis, no workspace",
        "none",
        ("less_than",),
        further_makers.compare_fourier,
        f"{DRAPER}; Beauregard 2003, quant-ph/0205095",
        fits=_by_constant,
        controls=2,
        sizes=(1, LARGEST_FOURIER),
    ),
    way(
        "lookup-unary",
        "unary iteration on clean wires",
        "clean",
        ("lookup",),
        partial(further_makers.lookup_unary, measured=False),
        _UNARY,
    ),
    way(
        "lookup-unary-measured",
        "unary iteration on clean wires, cleaned by measurement",
        "clean",
        ("lookup",),
        partial(further_makers.lookup_unary, measured=True),
        _UNARY,
        fits=_needs_ands,
        measured=True,
    ),
    way(
        "multiply-ripple-none",
        "controlled ripple additions",
        "clean",
        ("multiply_add",),
        partial(further_makers.multiply_ripple, clean=False),
        f"schoolbook; {TAKAHASHI}",
    ),
    way(
        "multiply-ripple-one",
        "controlled ripple additions on one clean wire",
        "clean",
        ("multiply_add",),
        partial(further_makers.multiply_ripple, clean=True),
        f"schoolbook; {CUCCARO}; {CONTROLLED}",
    ),
    way(
        "multiply-ands-measured",
        "controlled additions by ANDs, cleaned by measurement",
        "clean",
        ("multiply_add",),
        partial(further_makers.multiply_ands, measured=True),
        f"schoolbook; {GIDNEY}",
        measured=True,
    ),
    way(
        "multiply-fourier",
        "a phase for every pair of bits in the Fourier basis",
        "none",
        ("multiply_add",),
        further_makers.multiply_fourier,
        "Ruiz-Perez and Garcia-Escartin 2017, arXiv 1411.5949",
        controls=0,
        sizes=(1, LARGEST_FOURIER),
    ),
)


def swap_way(size: int, *, lent: bool, measured: bool) -> Way:
    """Return the select-swap look-up with so many words in a block."""
    kind: Workspace = "borrowed" if lent else "clean"
    suffix = "-measured" if measured else ""
    title = f"blocks of {size} words swapped to the front, {kind} words"
    return way(
        f"lookup-swap-{kind}-{size}{suffix}",
        title + (", ANDs cleaned by measurement" if measured else ""),
        kind,
        ("lookup",),
        partial(further_makers.lookup_swap, size=size, lent=lent, measured=measured),
        _SWAP,
        fits=lambda signature: 2 * size <= len(signature.table),
        measured=measured,
    )


def taken_way(size: int) -> Way:
    """Return the measured end of a look-up with so many addresses in a block."""
    return way(
        f"lookup-taken-{size}-measured",
        f"word taken away by measurement, phase fixed in blocks of {size}",
        "clean",
        ("lookup",),
        partial(further_makers.lookup_taken, size=size),
        "Berry et al. 2019, arXiv 1902.02134",
        fits=lambda signature: (
            signature.inverse and (size == 1 or 2 * size <= len(signature.table))
        ),
        measured=True,
    )
