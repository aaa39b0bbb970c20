"""The table of arithmetic recipes, first part: additions, constants, increments."""

from __future__ import annotations

from functools import partial

from placer.program.signature import Signature
from placer.recipes import makers
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

_ADD = ("add", "subtract")
_STEP = ("increment", "decrement")
_BORROWED = "Gidney 2015, Constructing large increment gates"


def _no_carry_if_controlled(signature: Signature) -> bool:
    return not (signature.controls and signature.carry)


def _short_ripple(signature: Signature) -> bool:
    return signature.carry and not signature.controls


def _few_wires(signature: Signature) -> bool:
    return signature.controls + signature.width + signature.carry <= 3


def _inverse_only(signature: Signature) -> bool:
    return signature.inverse and signature.width + signature.carry > 1


ADDITIONS: tuple[Way, ...] = (
    way(
        "add-ripple-one",
        "ripple carry on one clean wire",
        "clean",
        _ADD,
        makers.add_ripple_one,
        f"{CUCCARO}; {CONTROLLED}",
    ),
    way(
        "add-ripple-one-short",
        "ripple carry of half the depth on one clean wire",
        "clean",
        _ADD,
        makers.add_ripple_one_short,
        CUCCARO,
        fits=_short_ripple,
        controls=0,
        sizes=(4, None),
    ),
    way(
        "add-ripple-none",
        "ripple carry without workspace",
        "none",
        _ADD,
        makers.add_ripple_none,
        f"{TAKAHASHI}; controlled form derived here",
        fits=_no_carry_if_controlled,
    ),
    way(
        "add-lookahead",
        "carry look-ahead in place on clean wires",
        "clean",
        _ADD,
        partial(makers.add_lookahead, measured=False),
        DKRS,
        sizes=(2, None),
    ),
    way(
        "add-lookahead-measured",
        "carry look-ahead in place on clean wires, cleaned by measurement",
        "clean",
        _ADD,
        partial(makers.add_lookahead, measured=True),
        f"{DKRS}; {GIDNEY}",
        sizes=(2, None),
        measured=True,
    ),
    way(
        "add-ands-measured",
        "temporary ANDs on clean wires, cleaned by measurement",
        "clean",
        _ADD,
        partial(makers.add_ands, measured=True),
        GIDNEY,
        sizes=(2, None),
        measured=True,
    ),
    way(
        "add-ands-mirror",
        "temporary ANDs on clean wires and their mirror image",
        "clean",
        _ADD,
        partial(makers.add_ands, measured=False),
        GIDNEY,
        sizes=(2, None),
    ),
    way(
        "add-fourier",
        "phases in the Fourier basis, no workspace",
        "none",
        _ADD,
        makers.add_fourier,
        DRAPER,
        sizes=(1, LARGEST_FOURIER),
    ),
    way(
        "sum-ands",
        "ANDs that become the sum, no workspace, and their mirror image",
        "none",
        ("sum",),
        partial(makers.sum_ands, measured=False),
        GIDNEY,
        controls=0,
    ),
    way(
        "sum-ands-measured",
        "sum taken away by measurement, no workspace",
        "none",
        ("sum",),
        partial(makers.sum_ands, measured=True),
        GIDNEY,
        fits=_inverse_only,
        controls=0,
        measured=True,
    ),
    way(
        "sum-lookahead",
        "carry look-ahead out of place on clean wires",
        "clean",
        ("sum",),
        makers.sum_lookahead,
        DKRS,
        controls=0,
    ),
    way(
        "constant-clean",
        "ladder of carries on n-3 clean wires",
        "clean",
        ("add_constant",),
        partial(makers.constant_clean, measured=False),
        LADDER,
    ),
    way(
        "constant-clean-measured",
        "ladder of carries on n-2 clean wires, cleaned by measurement",
        "clean",
        ("add_constant",),
        partial(makers.constant_clean, measured=True),
        f"{LADDER}; {GIDNEY}",
        measured=True,
    ),
    way(
        "constant-loaded",
        "constant written into n clean wires, ripple carry",
        "clean",
        ("add_constant",),
        partial(makers.constant_loaded, measured=False),
        f"common practice; {TAKAHASHI}",
    ),
    way(
        "constant-loaded-measured",
        "constant written into clean wires, ANDs cleaned by measurement",
        "clean",
        ("add_constant",),
        partial(makers.constant_loaded, measured=True),
        f"common practice; {GIDNEY}",
        measured=True,
    ),
    way(
        "constant-borrowed",
        "halves that lend to one another, one borrowed wire",
        "borrowed",
        ("add_constant",),
        makers.constant_borrowed,
        f"{HANER}; {_BORROWED}",
    ),
    way(
        "constant-fourier",
        "phases in the Fourier basis, no workspace",
        "none",
        ("add_constant", *_STEP),
        makers.constant_fourier,
        f"{DRAPER}; Beauregard 2003, quant-ph/0205095",
        controls=2,
        sizes=(1, LARGEST_FOURIER),
    ),
    way(
        "increment-none",
        "cascade of products on at most three wires",
        "none",
        _STEP,
        makers.increment_none,
        "common practice",
        fits=_few_wires,
    ),
    way(
        "increment-clean",
        "ladder of products on n-3 clean wires",
        "clean",
        _STEP,
        partial(makers.constant_clean, measured=False),
        "common practice",
        controls=None,
    ),
    way(
        "increment-clean-measured",
        "ladder of ANDs on n-2 clean wires, cleaned by measurement",
        "clean",
        _STEP,
        partial(makers.constant_clean, measured=True),
        GIDNEY,
        controls=None,
        measured=True,
    ),
    way(
        "increment-clean-log",
        "conditionally clean prefixes on about lg n clean wires",
        "clean",
        _STEP,
        makers.increment_log,
        KHATTAR,
        sizes=(2, None),
    ),
    way(
        "increment-borrowed",
        "two subtractions of a number and its complement, n borrowed wires",
        "borrowed",
        _STEP,
        partial(makers.increment_borrowed, form="all"),
        f"{_BORROWED}; {TAKAHASHI}",
    ),
    way(
        "increment-borrowed-short",
        "two subtractions of a number and its complement, n-1 borrowed wires",
        "borrowed",
        _STEP,
        partial(makers.increment_borrowed, form="short"),
        f"{_BORROWED}; {TAKAHASHI}; short form derived here",
    ),
    way(
        "increment-borrowed-one",
        "halves that lend to one another, one borrowed wire",
        "borrowed",
        _STEP,
        partial(makers.increment_borrowed, form="one"),
        f"{_BORROWED}; {HANER}",
    ),
)
