"""Recipes on conditionally clean wires: one or two wires stand for a whole workspace.

Once a product of some controls is stored, those controls are known to be 1 in the only
branch that matters, and may hold further products.
Sources: Khattar and Gidney 2024, arXiv 2407.17966; the forms of logarithmic depth from
one wire rebuilt independently.
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes.borrowed import add_product, chain
from placer.recipes.draft import Draft, Job, Made, both, join
from placer.recipes.toffoli import finish, relative, side_in, toffoli, toggle, twice


def reuse(first: int, second: int, wire: int) -> Draft:
    """Return a wire that was 1 turned into the product of two factors."""
    return both("x", wire) + relative(first, second, wire)


def squeeze(row: Sequence[int]) -> tuple[Draft, int]:
    """Return the piece that leaves one factor beside the first wire of a row.

    `row[0]` holds row[1] * row[2] already.  Going up, row[2], row[4], ... take the
    product of the two wires after them; coming down, the two last factors are joined
    into the wire before them, which the factor below has consumed.
    """
    last = len(row) - 1
    pieces: list[Draft] = []
    factors: list[int] = []
    at = 2
    while at + 2 <= last:
        pieces.append(reuse(row[at + 1], row[at + 2], row[at]))
        factors.append(at)
        at += 2
    if at + 1 <= last:
        factors.append(last)
    while len(factors) > 1:
        above, below = factors.pop(), factors.pop()
        pieces.append(reuse(row[below], row[above], row[below - 1]))
        factors.append(below - 1)
    return join(pieces), row[factors[0]]


def two_factors(clean: int, factors: Sequence[int]) -> tuple[Draft, int, int]:
    """Return the piece that leaves the product of factors on two wires."""
    if len(factors) == 2:
        return Draft(), factors[0], factors[1]
    inner, other = squeeze([clean, *factors])
    return relative(factors[0], factors[1], clean) + inner, clean, other


def grow(free: Sequence[int], controls: Sequence[int]) -> tuple[Draft, list[int]]:
    """Return the piece that packs controls into few roots, in trees that double.

    The m wires in `free` are 1 where it matters.  The next m + 1 controls are joined in
    a balanced tree on them; the root counts as a factor, and the 2m wires that the tree
    consumed are free for the next round.
    """
    spare, left = list(free), list(controls)
    ready: dict[int, int] = {}
    pieces: list[Draft] = []
    roots: list[int] = []
    while left:
        row, left = left[: len(spare) + 1], left[len(spare) + 1 :]
        consumed: list[int] = []
        while len(row) > 1:
            row.sort(key=lambda wire: ready.get(wire, 0))
            spare.sort(key=lambda wire: ready.get(wire, 0))
            first, second, wire = row[0], row[1], spare.pop(0)
            pieces.append(reuse(first, second, wire))
            time = 1 + max(ready.get(used, 0) for used in (first, second, wire))
            ready.update({first: time, second: time, wire: time})
            consumed += [first, second]
            row = [*row[2:], wire]
        roots += row
        spare += consumed
    return join(pieces), roots


def one(job: Job) -> Made:
    """Return the conditionally clean ladder: 2k-3 Toffolis, one clean."""
    compute, first, second = two_factors(job.first_slot, range(job.controls))
    draft = join((compute, finish(job, first, second), compute.inverse()))
    return Made(draft, ("clean",))


def one_toggled(job: Job) -> Made:
    """Return the toggle-detected ladder: 4k-8 Toffolis, one borrowed."""
    helper = job.first_slot
    before, steady = squeeze([helper, *range(job.controls)])
    return Made(
        toggle(job, before, helper, steady, relative(0, 1, helper)), ("borrowed",)
    )


def add_product_toggled(controls: Sequence[int], helper: int, target: int) -> Draft:
    """Return target ^= product, up to phases on controls and target.

    12m-26 CNOT and 16m-36 T for m >= 4 controls, with one borrowed wire, restored.
    """
    before, steady = squeeze([helper, *controls])
    flip = relative(controls[0], controls[1], helper)
    return twice(before, side_in(helper, steady, target), flip)


def _two_clean(
    first: int, second: int, controls: Sequence[int]
) -> tuple[Draft, int, int]:
    """Return the trees on two clean wires: the piece and its two last factors."""
    start = relative(controls[0], controls[1], first)
    trees, roots = grow(controls[:2], controls[2:])
    end, left, right = two_factors(second, [first, *roots])
    return join((start, trees, end)), left, right


def two_log(job: Job) -> Made:
    """Return the conditionally clean trees: 2k-3 Toffolis, two clean, log depth."""
    compute, first, second = _two_clean(
        job.first_slot, job.first_slot + 1, range(job.controls)
    )
    draft = join((compute, finish(job, first, second), compute.inverse()))
    return Made(draft, ("clean", "clean"))


def one_log_toggled(job: Job) -> Made:
    """Return the trees from one borrowed wire: 4k-8 Toffolis, log depth.

    If the first two controls are both 1 they serve as the two clean wires; if not, the
    borrowed wire is not flipped and the two halves cancel.
    """
    helper = job.first_slot
    clear = both("x", 0) + both("x", 1)
    inner, first, second = _two_clean(0, 1, [helper, *range(2, job.controls)])
    compute = clear + inner
    middle = toffoli(first, second, job.target)
    flip = relative(0, 1, helper)
    if job.kind == "mcz":
        middle = join((both("h", job.target), middle, both("h", job.target)))
    half = join((compute, middle, compute.inverse()))
    draft = join((half, flip, half.inverse(), flip.inverse()))
    return Made(draft, ("borrowed",))


def one_log(job: Job) -> Made:
    """Return the trees from one clean wire: 2k-2 Toffolis, log depth.

    Three factors are left; they meet on the target, one idle control being borrowed.
    """
    clean = job.first_slot
    start = relative(0, 1, clean)
    trees, roots = grow([0], range(2, job.controls))
    row = [1, *roots]
    end, first, second = Draft(), roots[0], roots[1]
    if len(roots) > 2:
        inner, second = squeeze(row)
        end, first = reuse(roots[0], roots[1], 1) + inner, 1
    compute = join((start, trees, end))
    factors = (clean, first, second)
    idle = [wire for wire in range(job.controls) if wire not in factors]
    middle = _three_factors(job, factors, idle[0])
    return Made(join((compute, middle, compute.inverse())), ("clean",))


def _three_factors(job: Job, factors: tuple[int, int, int], idle: int) -> Draft:
    """Return what a call does with three factors and a borrowed wire."""
    if job.kind == "and":
        piece = add_product(factors, [idle], job.target)
        whole = piece + Draft((), both("sdg", job.target).fine)
        return whole.inverse() if job.inverse else whole
    return toggle(job, Draft(), idle, factors[2], chain(factors[:2], [idle]))
