"""Recipes from controlled roots, in quadratic size, most of them without workspace.

The target is kept in the phase frame, so that every root is a controlled phase.
Sources: Barenco et al. 1995, quant-ph/9503016, Lemma 7.5; Saeedi and Pedram 2013,
arXiv 1303.3557; da Silva and Park 2022, arXiv 2203.11882.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

from placer.recipes.borrowed import add_product
from placer.recipes.circuit import Op
from placer.recipes.conditional import add_product_toggled
from placer.recipes.draft import Draft, Job, Made, both, join, phase, same
from placer.recipes.toffoli import controlled_phase, relative_three


def root(angle: float, control: int, target: int) -> Draft:
    """Return a controlled root: one gate when counted, 2 CNOT when spelled out."""
    coarse = (Op("cp", (control, target), (angle,)),)
    return Draft(coarse, controlled_phase(angle, control, target))


def framed(job: Job, inner: Draft) -> Made:
    """Return the phase on all wires, between Hadamards where the call is an X."""
    if job.kind in ("mcx", "and"):
        inner = join((both("h", job.target), inner, both("h", job.target)))
    return Made(inner, as_one=True)


def full_angle(job: Job) -> float:
    """Return the phase that |1...1> gets in the phase frame."""
    return job.angle if job.kind == "mcp" else math.pi


def quadratic(job: Job) -> Made:
    """Return the recursion on the highest control: 2k-1 controlled roots.

    The product of the lower controls is added to the highest one between two opposite
    half-angle phases; what is left is the same call with one control fewer and half
    the angle.  The controls already done are lent to the products, and the target last:
    what the two products of a level do on wires other than the target meets and
    cancels.
    """
    return framed(job, _recursion(job, []))


def lent(job: Job) -> Made:
    """Return the recursion of `quadratic` with k-3 borrowed wires.

    They make every product a V-chain clear of the target, so that half of each pair of
    products cancels: far fewer CNOT, still of quadratic size.  For X and Z
    the V-chain alone is better.
    """
    count = job.controls - 3
    wires = range(job.first_slot, job.first_slot + count)
    return Made(_recursion(job, wires), same("borrowed", count))


def _recursion(job: Job, borrowed: Sequence[int]) -> Draft:
    angle, pieces = full_angle(job), list[Draft]()
    for top in range(job.controls - 1, 0, -1):
        angle /= 2
        idle = [*borrowed, *range(top + 1, job.controls), job.target]
        add = _add_below(top, idle)
        half = _half_root(angle, top, job.target)
        pieces += [half, add, half.inverse(), add.inverse()]
    pieces.append(root(angle, 0, job.target))
    return join(pieces)


def _half_root(angle: float, control: int, target: int) -> Draft:
    """Return a controlled phase without its part on the target alone.

    It comes in opposite pairs, between which the target rests; that part cancels.
    """
    ops = (
        *phase(angle / 2, control),
        Op("cx", (control, target)),
        *phase(-angle / 2, target),
        Op("cx", (control, target)),
    )
    return Draft((Op("cp", (control, target), (angle,)),), ops)


def _add_below(top: int, idle: Sequence[int]) -> Draft:
    """Return c_top ^= product of all lower controls, up to phases."""
    lower = range(top)
    if top == 1:
        return both("cx", 0, 1)
    if top == 3:
        written = add_product(lower, idle, top)
        return Draft(written.coarse, relative_three(0, 1, 2, top).fine)
    if top - 2 <= len(idle):
        return add_product(lower, idle, top)
    return add_product_toggled(lower, idle[0], top)


def gray(job: Job) -> Made:
    """Return the phases of all parities in Gray order: 2^(k+1) - 2 CNOT.

    |1...1> gets the angle when a parity of j wires gets angle / 2^k, with the sign
    (-1)^(j+1).
    """
    whole = full_angle(job)
    step = whole / 2**job.controls
    ops: list[Op] = []
    for wire in range(job.controls, -1, -1):
        held = 0
        for count in range(1, 2**wire + 1):
            ones = 1 + held.bit_count()
            ops += phase(step if ones % 2 else -step, wire)
            if wire == 0:
                break
            turned = min((count & -count).bit_length() - 1, wire - 1)
            held ^= 1 << turned
            ops.append(Op("cx", (turned, wire)))
    coarse = (Op("mcp", tuple(range(job.controls + 1)), (whole,)),)
    return framed(job, Draft(coarse, tuple(ops)))


def linear(job: Job) -> Made:
    """Return the linear-depth form: 2k^2-2k+1 controlled roots in depth 8k-12."""
    whole, count = full_angle(job), job.controls
    roots = _roots_down(whole, count, job.target)
    back = _roots_up(whole, count, job.target)
    ripple = _ripple(count - 1)
    return framed(job, join((roots, ripple, back, ripple.inverse())))


def _angles(whole: float, count: int) -> list[float]:
    """Return the root of each control; the two lowest share the smallest."""
    return [whole / 2 ** min(count - at, count - 1) for at in range(count)]


def _roots_down(whole: float, count: int, target: int) -> Draft:
    angles = _angles(whole, count)
    return join(root(angles[at], at, target) for at in reversed(range(count)))


def _roots_up(whole: float, count: int, target: int) -> Draft:
    angles = _angles(whole, count)
    return join(root(-angles[at], at, target) for at in range(1, count))


def _ripple(top: int) -> Draft:
    """Return c_j ^= product of all lower controls, for j from `top` down to 1."""
    if top == 1:
        return both("cx", 0, 1)
    pieces: Iterable[Draft] = (
        both("h", top),
        _roots_down(math.pi, top, top),
        _ripple(top - 1),
        _roots_up(math.pi, top, top),
        both("h", top),
    )
    return join(pieces)
