"""Toffoli-size pieces: exact, up to relative phase, temporary AND, measured cleanup.

Each piece is a `Draft`: one ccx at the coarse level, its gates at the fine level.  What
a relative-phase piece leaves behind must be cancelled by its user.
Sources: Nielsen and Chuang 2000, fig. 4.9; Maslov 2016, arXiv 1508.03273; Gidney 2018,
arXiv 1709.06648; Barenco et al. 1995, quant-ph/9503016.
"""

from __future__ import annotations

import math

from placer.recipes.circuit import Op
from placer.recipes.draft import Draft, Job, Made, both, gates, join, phase


def toffoli(first: int, second: int, target: int) -> Draft:
    """Return the textbook Toffoli: 6 CNOT, 7 T, T-depth 4."""
    inner = three_wire_phase(math.pi, first, second, target)
    fine = (Op("h", (target,)), *inner, Op("h", (target,)))
    return Draft((Op("ccx", (first, second, target)),), fine)


def three_wire_phase(
    angle: float, first: int, second: int, target: int
) -> tuple[Op, ...]:
    """Return the gates that give |111> a phase: 6 CNOT, seven quarter-angle phases.

    With the angle pi this is the inside of the textbook Toffoli.
    """
    a, b, c, quarter = first, second, target, angle / 4
    return (
        *gates(("cx", b, c)),
        *phase(-quarter, c),
        *gates(("cx", a, c)),
        *phase(quarter, c),
        *gates(("cx", b, c)),
        *phase(-quarter, c),
        *gates(("cx", a, c)),
        *phase(quarter, b),
        *phase(quarter, c),
        *gates(("cx", a, b)),
        *phase(quarter, a),
        *phase(-quarter, b),
        *gates(("cx", a, b)),
    )


def controlled_phase(angle: float, control: int, target: int) -> tuple[Op, ...]:
    """Return the gates that give |11> a phase: 2 CNOT, three half-angle phases."""
    return (
        *phase(angle / 2, control),
        *phase(angle / 2, target),
        *gates(("cx", control, target)),
        *phase(-angle / 2, target),
        *gates(("cx", control, target)),
    )


def relative(first: int, second: int, target: int) -> Draft:
    """Return the relative-phase Toffoli: 3 CNOT, 4 T.

    Phases on (first, second, target): i on 110, -i on 111, -1 on 101.
    """
    a, b, t = first, second, target
    return Draft(
        (Op("ccx", (a, b, t)),),
        gates(
            ("h", t),
            ("t", t),
            ("cx", b, t),
            ("tdg", t),
            ("cx", a, t),
            ("t", t),
            ("cx", b, t),
            ("tdg", t),
            ("h", t),
        ),
    )


def relative_three(first: int, second: int, third: int, target: int) -> Draft:
    """Return target ^= product of three wires up to phases: 6 CNOT, 8 T, no workspace.

    Fig. 4 of Maslov 2016, from memory; the phases were checked by simulation.
    """
    a, b, c, t = first, second, third, target
    edge = gates(("h", t), ("t", t), ("cx", c, t), ("tdg", t), ("h", t))
    middle = gates(
        ("cx", a, t),
        ("t", t),
        ("cx", b, t),
        ("tdg", t),
        ("cx", a, t),
        ("t", t),
        ("cx", b, t),
        ("tdg", t),
    )
    return Draft((Op("mcx", (a, b, c, t)),), (*edge, *middle, *edge))


def side_in(changing: int, steady: int, target: int) -> Draft:
    """Return the first half of a relative-phase Toffoli: 2 CNOT, 2 T.

    Together with `side_out` it adds steady * (difference of `changing` between the
    two) to the target, up to the phases of `relative`.
    """
    return Draft(
        (Op("ccx", (steady, changing, target)),),
        gates(
            ("h", target),
            ("t", target),
            ("cx", steady, target),
            ("tdg", target),
            ("cx", changing, target),
        ),
    )


def side_out(changing: int, steady: int, target: int) -> Draft:
    """Return the second half of a relative-phase Toffoli: 2 CNOT, 2 T."""
    return side_in(changing, steady, target).inverse()


def shared_top(changing: int, steady: int, target: int) -> Draft:
    """Return the part of a CCZ that depends on `changing`: 4 CNOT, 4 T.

    Used twice, the second time mirrored, with the changing wire flipped between; the
    other terms of the two CCZ would cancel.  The target is kept in the phase frame.
    """
    b, c, t = changing, steady, target
    return Draft(
        (Op("ccx", (c, b, t)),),
        gates(
            ("t", b),
            ("cx", c, b),
            ("tdg", b),
            ("cx", t, b),
            ("t", b),
            ("cx", c, b),
            ("tdg", b),
            ("cx", t, b),
        ),
    )


def twice_shared_top(changing: int, also: int, target: int) -> Draft:
    """Return the part of a CCZ that depends on `changing` and on `also`: 4 CNOT, 2 T.

    Where whole circuits built with `shared_top` come in mirrored pairs between which
    `also` is flipped, terms without `also` cancel as well.
    """
    b, c, t = changing, also, target
    return Draft(
        (Op("ccx", (c, b, t)),),
        gates(("cx", c, b), ("tdg", b), ("cx", t, b), ("t", b), ("cx", c, b))
        + gates(("cx", t, b)),
    )


def temporary_and(first: int, second: int, target: int) -> Draft:
    """Return the product into a target in |0>: 3 CNOT, 4 T, exact."""
    piece = relative(first, second, target)
    return Draft(piece.coarse, (*piece.fine, Op("sdg", (target,))))


def measured_cleanup(first: int, second: int, target: int, bit: int) -> Draft:
    """Return the measured way to take a product out of its wire, which ends in |0>.

    X-basis measurement, then with probability 1/2 a CZ on the two factors.
    """
    ops = (
        Op("h", (target,)),
        Op("measure", (target,), bit=bit),
        Op("cz", (first, second), condition=bit),
        Op("x", (target,), condition=bit),
    )
    return Draft(ops, ops)


def open_frame(job: Job) -> Draft:
    """Return the gate that brings the target into the phase frame.

    Mirrored pairs of `shared_top` are written as Toffolis at the coarse level and act
    as phases at the fine level.
    """
    hadamard = (Op("h", (job.target,)),)
    return Draft(hadamard, ()) if job.kind == "mcz" else Draft((), hadamard)


def finish(job: Job, first: int, second: int) -> Draft:
    """Return what a call does once two factors hold the product of its controls."""
    target = job.target
    if job.kind == "and":
        piece = temporary_and(first, second, target)
        return piece.inverse() if job.inverse else piece
    if job.kind == "mcp":
        wires = (first, second, target)
        coarse = (Op("mcp", wires, (job.angle,)),)
        return Draft(coarse, three_wire_phase(job.angle, *wires))
    piece = toffoli(first, second, target)
    if job.kind == "mcz":
        hadamard = both("h", target)
        return join((hadamard, piece, hadamard))
    return piece


def toggle(job: Job, before: Draft, changing: int, steady: int, flip: Draft) -> Draft:
    """Return a call done by toggle detection.

    `before` prepares the factor `steady` without looking at `changing`; `flip` adds
    the other factor to `changing`.  Whatever `changing` held cancels.
    """
    if job.kind == "and":
        top = side_in(changing, steady, job.target)
        whole = twice(before, top, flip) + Draft((), (Op("sdg", (job.target,)),))
        return whole.inverse() if job.inverse else whole
    frame = open_frame(job)
    top = shared_top(changing, steady, job.target)
    return join((frame, twice(before, top, flip), frame))


def twice(before: Draft, top: Draft, flip: Draft) -> Draft:
    """Return `top` done within `before` twice, the second time mirrored and flipped."""
    back = before.inverse()
    return join((before, top, back, flip, before, top.inverse(), back, flip.inverse()))


def textbook(job: Job) -> Made:
    """Return the two-control call without workspace."""
    return Made(finish(job, 0, 1))


def and_mirror(job: Job) -> Made:
    """Return the temporary AND of two controls, or its mirror image."""
    return Made(finish(job, 0, 1))


def and_three(job: Job) -> Made:
    """Return the product of three controls without workspace: 8 CNOT, 11 T.

    On a target in |0> the phases of `relative_three` are i^(ab) on the controls and
    i on the product; both are taken back.
    """
    piece = relative_three(0, 1, 2, job.target)
    mend = (*controlled_phase(-math.pi / 2, 0, 1), Op("sdg", (job.target,)))
    whole = piece + Draft((), mend)
    return Made(whole.inverse() if job.inverse else whole)


def and_measured(job: Job) -> Made:
    """Return the measured cleanup of a product of two controls."""
    return Made(measured_cleanup(0, 1, job.target, 0), bits=1)
