"""Ripple-carry addition: one clean wire, or none.

In: wires.  Out: drafts.  Carries travel through the wires of A and are taken back on
the way down, so that nearly every Toffoli has a mirror image and may be relative-phase.
Sources: Cuccaro et al. 2004, quant-ph/0410184; Takahashi, Tani and Kunihiro 2009,
arXiv 0910.2530; Munoz-Coreas and Thapliyal 2017, arXiv 1706.05113 (controlled).
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes.draft import Draft, both, join
from placer.recipes.toffoli import relative, toffoli

Wires = Sequence[int]


def majority(carry: int, b: int, a: int) -> Draft:
    """Return the block that turns (c, b, a) into (c ^ a, b ^ a, next carry)."""
    return join((both("cx", a, b), both("cx", a, carry), relative(carry, b, a)))


def _write(carry: int, b: int, a: int) -> Draft:
    """Return the way back that leaves the sum on b."""
    back = relative(carry, b, a).inverse()
    return join((back, both("cx", a, carry), both("cx", carry, b)))


def _write_if(control: int, carry: int, b: int, a: int) -> Draft:
    """Return the way back that adds control * (carry ^ a) to b."""
    back = relative(carry, b, a).inverse()
    write = toffoli(control, carry, b)
    return join((back, both("cx", a, b), write, both("cx", a, carry)))


def one_clean(a: Wires, b: Wires, out: int | None, clean: int) -> Draft:
    """Return B += A: 2n Toffolis with carry out, 2n-2 without, one clean wire."""
    size = len(a)
    carries = [clean, *a]
    blocks = size if out is not None else size - 1
    pieces = [majority(carries[at], b[at], a[at]) for at in range(blocks)]
    if out is not None:
        pieces.append(both("cx", a[-1], out))
    else:
        last = carries[size - 1]
        pieces += [both("cx", a[-1], b[-1]), both("cx", last, b[-1])]
    pieces += [_write(carries[at], b[at], a[at]) for at in reversed(range(blocks))]
    return join(pieces)


def one_clean_if(
    control: int, a: Wires, b: Wires, out: int | None, clean: int
) -> Draft:
    """Return B += control * A: 3n-2 Toffolis (3n+1 with carry out), one clean wire."""
    size = len(a)
    carries = [clean, *a]
    blocks = size if out is not None else size - 1
    pieces = [majority(carries[at], b[at], a[at]) for at in range(blocks)]
    if out is not None:
        pieces.append(toffoli(control, a[-1], out))
    else:
        turn = both("cx", a[-1], carries[size - 1])
        pieces += [turn, toffoli(control, carries[size - 1], b[-1]), turn]
    pieces += [
        _write_if(control, carries[at], b[at], a[at]) for at in reversed(range(blocks))
    ]
    return join(pieces)


def one_clean_short(a: Wires, b: Wires, out: int, clean: int) -> Draft:
    """Return B += A with carry out: 2n-1 Toffolis, depth 2n+4, n >= 4, one clean wire.

    The middle of the circuit runs on the complement of the sums, which lets the blocks
    overlap.
    """
    size = len(a)
    # On the way back the sum bits stand complemented where the carries meet them, so
    # that relative phases would not cancel: exact Toffolis but for the lowest.
    low = relative(a[0], b[0], clean)
    second = toffoli(clean, b[1], a[1])
    blocks = [toffoli(a[at - 1], b[at], a[at]) for at in range(2, size - 1)]
    pieces = [both("cx", a[at], b[at]) for at in range(1, size)]
    pieces += [both("cx", a[1], clean), low, both("cx", a[2], a[1]), second]
    pieces.append(both("cx", a[3], a[2]))
    for at in range(2, size - 2):
        pieces += [blocks[at - 2], both("cx", a[at + 2], a[at + 1])]
    top = [both("cx", a[-1], out), toffoli(a[-2], b[-1], out)]
    pieces += [blocks[-1], *top]
    pieces += [both("x", b[at]) for at in range(1, size - 1)]
    pieces.append(both("cx", clean, b[1]))
    pieces += [both("cx", a[at - 1], b[at]) for at in range(2, size)]
    return join(pieces) + _short_way_back(a, b, clean)


def _short_way_back(a: Wires, b: Wires, clean: int) -> Draft:
    size = len(a)
    low = relative(a[0], b[0], clean).inverse()
    pieces = [toffoli(a[-3], b[-2], a[-2])]
    for at in reversed(range(2, size - 2)):
        pieces += [toffoli(a[at - 1], b[at], a[at]), both("cx", a[at + 2], a[at + 1])]
        pieces.append(both("x", b[at + 1]))
    pieces += [toffoli(clean, b[1], a[1]), both("cx", a[3], a[2]), both("x", b[2])]
    pieces += [low, both("cx", a[2], a[1]), both("x", b[1]), both("cx", a[1], clean)]
    pieces += [both("cx", a[at], b[at]) for at in range(size)]
    return join(pieces)


def _carries_on_a(a: Wires, b: Wires, out: int | None) -> tuple[list[Draft], Draft]:
    """Return the way up of the form without workspace, and the exact top, if any.

    Afterwards A[i] holds A[i] ^ carry and B[i] holds A[i] ^ B[i].
    """
    size = len(a)
    row = [*a] if out is None else [*a, out]
    pieces = [both("cx", a[at], b[at]) for at in range(1, size)]
    pieces += [
        both("cx", row[at], row[at + 1]) for at in reversed(range(1, len(row) - 1))
    ]
    pieces += [relative(a[at], b[at], a[at + 1]) for at in range(size - 1)]
    top = Draft() if out is None else toffoli(a[-1], b[-1], out)
    return pieces, top


def _carries_off_a(a: Wires) -> list[Draft]:
    return [both("cx", a[at], a[at + 1]) for at in range(1, len(a) - 1)]


def no_workspace(a: Wires, b: Wires, out: int | None) -> Draft:
    """Return B += A: 2n-1 Toffolis with carry out, 2n-2 without, no workspace."""
    size = len(a)
    pieces, top = _carries_on_a(a, b, out)
    pieces.append(top)
    for at in reversed(range(1, size)):
        pieces.append(both("cx", a[at], b[at]))
        pieces.append(relative(a[at - 1], b[at - 1], a[at]).inverse())
    pieces += _carries_off_a(a)
    pieces += [both("cx", a[at], b[at]) for at in range(size)]
    return join(pieces)


def no_workspace_if(control: int, a: Wires, b: Wires) -> Draft:
    """Return B += control * A: 3n-2 Toffolis, no workspace."""
    size = len(a)
    pieces, _ = _carries_on_a(a, b, None)
    for at in reversed(range(1, size)):
        pieces.append(toffoli(control, a[at], b[at]))
        pieces.append(relative(a[at - 1], b[at - 1], a[at]).inverse())
    pieces += _carries_off_a(a)
    pieces.append(toffoli(control, a[0], b[0]))
    pieces += [both("cx", a[at], b[at]) for at in range(1, size)]
    return join(pieces)


def carry_out(a: Wires, b: Wires, out: int) -> Draft:
    """Return out ^= carry of A + B: 2n-1 Toffolis, no workspace, A and B restored."""
    # The first gate on the carry wire copies A[n-1] and has no mirror here.
    copy = both("cx", a[-1], out) if len(a) > 1 else Draft()
    pieces, _ = _carries_on_a(a, b, None)
    up = join(pieces)
    return join((copy, up, toffoli(a[-1], b[-1], out), up.inverse()))


def carry_out_one_clean(
    a: Wires, b: Wires, out: int, clean: int, control: int | None = None
) -> Draft:
    """Return out ^= carry of A + B: 2n-1 Toffolis, 4n+1 CNOT, one clean wire.

    With a control it takes 2n+1 Toffolis.
    """
    size = len(a)
    carries = [clean, *a]
    blocks = [majority(carries[at], b[at], a[at]) for at in range(size)]
    if control is not None:
        up = join(blocks)
        return join((up, toffoli(control, a[-1], out), up.inverse()))
    up = join(blocks[:-1])
    turn = both("cx", a[-1], b[-1]) + both("cx", a[-1], carries[size - 1])
    top = toffoli(carries[size - 1], b[-1], out) + both("cx", a[-1], out)
    return join((up, turn, top, turn.inverse(), up.inverse()))
