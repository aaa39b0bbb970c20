"""Recipes without workspace: controlled roots, in quadratic size.

The target is kept in the phase frame, so that every root is a controlled phase.
Sources: Barenco et al. 1995, quant-ph/9503016, Lemma 7.5; Saeedi and Pedram 2013,
arXiv 1303.3557; da Silva and Park 2022, arXiv 2203.11882.
"""

from __future__ import annotations

import math
from collections.abc import Iterable

from placer.recipes.circuit import Op
from placer.recipes.draft import Draft, Job, Made, both, join
from placer.recipes.toffoli import controlled_phase


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
