"""Recipes that borrow many wires, or one wire and the call's own: V-chain, two halves.

Borrowed wires hold anything and are given back unchanged.
Sources: Barenco et al. 1995, quant-ph/9503016, Lemmas 7.2 and 7.3; Iten et al. 2016,
arXiv 1501.06911; Maslov 2016, arXiv 1508.03273.
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes.draft import Draft, Job, Made, join, same
from placer.recipes.toffoli import (
    open_frame,
    relative,
    shared_top,
    side_in,
    side_out,
    toggle,
    twice_shared_top,
)


def chain(controls: Sequence[int], borrowed: Sequence[int]) -> Draft:
    """Return the piece that adds the product of the controls to the last wire.

    The other borrowed wires are left changed and phases are left behind; the mirror
    image takes both away.  One borrowed wire fewer than controls.
    """
    last = len(borrowed) - 1
    into = [
        side_in(borrowed[at - 1], controls[at + 1], borrowed[at])
        for at in range(last, 0, -1)
    ]
    out = [
        side_out(borrowed[at - 1], controls[at + 1], borrowed[at])
        for at in range(1, last + 1)
    ]
    return join([*into, relative(controls[0], controls[1], borrowed[0]), *out])


def add_product(controls: Sequence[int], borrowed: Sequence[int], target: int) -> Draft:
    """Return target ^= product, up to phases on controls and target.

    8m-14 CNOT and 8m-12 T for m >= 3 controls, with m-2 borrowed wires, restored.
    """
    if len(controls) == 2:
        return relative(controls[0], controls[1], target)
    used = list(borrowed[: len(controls) - 2])
    flip = chain(controls[:-1], used)
    top = side_in(used[-1], controls[-1], target)
    return join((top, flip, top.inverse(), flip.inverse()))


def v_chain(job: Job) -> Made:
    """Return the V-chain: 4(k-2) Toffolis, 8k-10 CNOT, 8k-8 T, k-2 borrowed."""
    count = job.controls - 2
    wires = list(range(job.first_slot, job.first_slot + count))
    flip = chain(range(job.controls - 1), wires)
    draft = toggle(job, Draft(), wires[-1], job.controls - 1, flip)
    return Made(draft, same("borrowed", count))


def halves(job: Job) -> Made:
    """Return the call split in two halves: 8(k-3) Toffolis from k=5, one borrowed.

    The first half goes to the borrowed wire d, the second half and d to the target,
    and both again.  Each half borrows the wires of the other.
    """
    size = (job.controls + 2) // 2
    helper, target = job.first_slot, job.target
    first = list(range(size))
    second = list(range(size, job.controls))
    add = add_product(first, [*second, target], helper)
    if len(second) == 1:
        top = shared_top(helper, second[0], target)
    else:
        used = first[: len(second) - 1]
        flip = chain(second, used)
        mark = twice_shared_top(used[-1], helper, target)
        top = join((mark, flip, mark.inverse(), flip.inverse()))
    frame = open_frame(job)
    pieces = [frame, top, add, top.inverse(), add.inverse(), frame]
    draft = join(pieces)
    if job.kind == "and" and job.inverse:
        draft = draft.inverse()
    return Made(draft, ("borrowed",))
