"""Recipes on clean workspace: ladder, tree, held product, measured cleanup.

Partial products go into fresh wires; the last Toffoli lands on the target (k-2 clean)
or, where the product itself is needed, into one wire more (k-1 clean, `held`).
Sources: Barenco et al. 1995, quant-ph/9503016; Nielsen and Chuang 2000, fig. 4.10;
Gidney 2018, arXiv 1709.06648.
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes.circuit import Op
from placer.recipes.draft import Draft, Job, Made, both, join, same
from placer.recipes.toffoli import (
    controlled_phase,
    finish,
    measured_cleanup,
    relative,
    relative_three,
    temporary_and,
)

Product = tuple[int, int, int]
"""Two factors and the wire that takes their product."""


def ladder_products(
    controls: Sequence[int], fresh: Sequence[int]
) -> tuple[list[Product], list[int]]:
    """Return the products of a ladder, one a fresh wire, and the factors left over."""
    products: list[Product] = []
    left = list(controls)
    for wire in fresh:
        products.append((left[0], left[1], wire))
        left = [wire, *left[2:]]
    return products, left


def tree_products(
    controls: Sequence[int], fresh: Sequence[int]
) -> tuple[list[Product], list[int]]:
    """Return the products of a balanced tree and the factors left over."""
    products: list[Product] = []
    row, spare = list(controls), list(fresh)
    while spare:
        above: list[int] = []
        while len(row) >= 2 and spare:
            wire = spare.pop(0)
            products.append((row[0], row[1], wire))
            above.append(wire)
            row = row[2:]
        row = above + row
    return products, row


def _slots(job: Job, count: int) -> list[int]:
    return list(range(job.first_slot, job.first_slot + count))


def _mirrored(job: Job, shape: str, *, held: bool) -> Made:
    count = job.controls - (1 if held else 2)
    make = ladder_products if shape == "ladder" else tree_products
    products, left = make(range(job.controls), _slots(job, count))
    compute = join(relative(*product) for product in products)
    middle = _use_product(job, left[0]) if held else finish(job, left[0], left[1])
    draft = join((compute, middle, compute.inverse()))
    return Made(draft, same("clean", count))


def _use_product(job: Job, wire: int) -> Draft:
    """Return what a call does with the product of all its controls on one wire."""
    if job.kind == "mcp":
        coarse = (Op("cp", (wire, job.target), (job.angle,)),)
        return Draft(coarse, controlled_phase(job.angle, wire, job.target))
    return both("cz" if job.kind == "mcz" else "cx", wire, job.target)


def ladder(job: Job) -> Made:
    """Return the clean ladder: 2k-3 Toffolis, k-2 clean."""
    return _mirrored(job, "ladder", held=False)


def tree(job: Job) -> Made:
    """Return the clean tree: 2k-3 Toffolis in depth 2 ceil(lg k) - 1, k-2 clean."""
    return _mirrored(job, "tree", held=False)


def ladder_held(job: Job) -> Made:
    """Return the ladder that stores the whole product: 2(k-1) Toffolis, k-1 clean."""
    return _mirrored(job, "ladder", held=True)


def tree_held(job: Job) -> Made:
    """Return the tree that stores the whole product: 2(k-1) Toffolis, k-1 clean."""
    return _mirrored(job, "tree", held=True)


def half(job: Job) -> Made:
    """Return products of three: 6k-6 CNOT and 8k-9 T on half as many clean wires.

    Each relative-phase product of three takes two factors away; an odd call starts
    with a product of two.
    """
    count = (job.controls - 1) // 2
    row, fresh = list(range(job.controls)), _slots(job, count)
    pieces: list[Draft] = []
    for wire in fresh:
        size = 2 if len(row) % 2 else 3
        factors, row = row[:size], [*row[size:], wire]
        if size == 2:
            pieces.append(relative(factors[0], factors[1], wire))
        else:
            first, second, third = factors
            pieces.append(relative_three(first, second, third, wire))
    compute, middle = join(pieces), finish(job, row[0], row[1])
    return Made(join((compute, middle, compute.inverse())), same("clean", count))


def _measured(job: Job, shape: str, *, held: bool) -> Made:
    count = job.controls - (1 if held else 2)
    make = ladder_products if shape == "ladder" else tree_products
    products, left = make(range(job.controls), _slots(job, count))
    pieces = [temporary_and(*product) for product in products]
    bits = count
    if held:
        pieces.append(_use_product(job, left[0]))
    elif job.kind == "and" and job.inverse:
        pieces.append(measured_cleanup(left[0], left[1], job.target, bits))
        bits += 1
    else:
        pieces.append(finish(job, left[0], left[1]))
    pieces += [
        measured_cleanup(*product, bit)
        for bit, product in enumerate(reversed(products))
    ]
    return Made(join(pieces), same("clean", count), bits=bits)


def ladder_measured(job: Job) -> Made:
    """Return the ladder of ANDs cleaned by measurement: 4k-1 T, k-2 clean."""
    return _measured(job, "ladder", held=False)


def tree_measured(job: Job) -> Made:
    """Return the tree of ANDs cleaned by measurement: 4k-1 T, k-2 clean."""
    return _measured(job, "tree", held=False)


def held_measured(job: Job) -> Made:
    """Return the stored product cleaned by measurement: 4(k-1) T, k-1 clean."""
    return _measured(job, "tree", held=True)
