"""Counts by hand: tiny circuits whose depths and live times fit on a napkin."""

from __future__ import annotations

from placer.recipes.catalog import build
from placer.recipes.circuit import Op
from placer.recipes.counts import count, depth, schedule
from placer.recipes.draft import gates


def test_schedule_waits_for_wires_and_for_measurements() -> None:
    ops = (
        *gates(("h", 0), ("h", 1), ("cx", 0, 1)),
        Op("measure", (0,), bit=0),
        Op("x", (2,), condition=0),
    )
    times = schedule(ops, lambda _: True)
    assert times == [(0, 1), (0, 1), (1, 2), (2, 3), (3, 4)]
    assert depth(ops) == 4
    assert depth(ops, lambda op: op.name == "cx") == 1
    assert depth(()) == 0


def test_toffoli_by_hand() -> None:
    """Gate list of Nielsen and Chuang, fig. 4.9: h 2, cx 6, t or tdg 7."""
    sizes = count(build("toffoli", "mcx", 2))
    assert (sizes.two_qubit, sizes.t, sizes.t_depth, sizes.toffoli) == (6, 7, 4, 1)
    assert sizes.rotations == sizes.measurements == sizes.clean == sizes.borrowed == 0
    assert sizes.live_gates == ()


def test_ladder_of_three_by_hand() -> None:
    """Let a ^= c1 c2 take slot 0-1, the target 1-2, the undoing 2-3: a lives one slot.

    Spelled out, all 12 cx follow one another but one: the first of the middle Toffoli
    comes from c3 and does not wait for a.  On a: h 0-1, t 1-2, first cx 2-3, six more
    gates to 9; the middle uses a at 9-10, 13-14, 14-15, 15-16, 16-17; then h and t to
    19, cx 19-20, tdg, cx 21-22, t, last cx 23-24.  From 3 to 23 are 20 slots.
    """
    sizes = count(build("clean-ladder", "mcx", 3))
    assert sizes.live_toffoli == (1,)
    assert sizes.toffoli_depth == 3
    assert sizes.two_qubit_depth == 11
    assert sizes.live_gates == (20,)


def test_measured_cleanup_counts_apart() -> None:
    sizes = count(build("clean-measured", "mcx", 5))
    assert (sizes.two_qubit, sizes.two_qubit_conditional) == (15, 3)
    assert (sizes.measurements, sizes.clean, sizes.t) == (3, 3, 19)


def test_rotations_of_a_phase() -> None:
    """A three-wire phase needs all seven quarter-angle phases, none of them a T."""
    sizes = count(build("toffoli", "mcp", 2, 0.3))
    assert (sizes.rotations, sizes.t, sizes.two_qubit) == (7, 0, 6)


def test_level2_chain_of_two_by_hand() -> None:
    """c1 lifts c2 in slot 0-1, target in 1-2, back in 2-3: one slot in |2>."""
    sizes = count(build("level2-chain", "mcx", 2))
    assert (sizes.level2_gates, sizes.level2_depth) == (3, 3)
    assert (sizes.level2_sum, sizes.level2_longest, sizes.level2_window) == (1, 1, 3)
