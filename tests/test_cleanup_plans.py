"""Programs with scopes from end to end: plans, placed files, and the demos' claims."""

from __future__ import annotations

import json
import random
from collections.abc import Sequence

import pytest

import placer
from placer.check.cleanup import follow_moves
from placer.device.read import find_device
from placer.planner.orders import game_of, orders_of
from placer.program.planned import planned_program
from placer.program.read import read_program
from placer.program.values import values_of
from placer.report.qasm import placed_qasm
from tests.check.cleanup_sample import LADDER, reordered
from tests.replay_reader import same_function

# The same program, flat, by hand.
FLAT = """OPENQASM 3.0;
include "stdgates.inc";
qubit[4] a;
qubit[2] t;
@placer.workspace init=zero ends=zero
qubit[3] v;
reset a;
reset t;
h a;
ccx a[0], a[1], v[0];
x a[2];
ccx v[0], a[2], v[1];
x a[2];
ccx v[1], a[3], v[2];
cx v[2], t[0];
h t[1];
cx v[0], t[1];
cx v[2], t[1];
ccx v[1], a[3], v[2];
x a[2];
ccx v[0], a[2], v[1];
x a[2];
ccx a[0], a[1], v[0];
h a[2];
cx t[0], t[1];
"""
DEMOS = ("signal-relay", "lock-ladder", "pilot-book")


@pytest.mark.parametrize("gates", ["toffoli", "clifford-t"])
def test_a_measured_record_and_its_fix_compute_the_same(gates: str) -> None:
    data = json.loads(reordered())
    device = find_device("slate-16")
    moves = data["cleanup"]["moves"]
    assert any(action == "drop" for action, _ in moves)
    program = planned_program(read_program(LADDER, "r.yaml"), moves, device)
    text = placed_qasm(data, program, device, gates=gates)  # type: ignore[arg-type]
    assert "if (record" in text
    assert same_function(FLAT, text, samples=6) == []
    # Without the fix a phase stays: the comparison sees it.
    lines = [line for line in text.split("\n") if "z $" not in line]
    assert len(lines) < len(text.split("\n"))
    assert same_function(FLAT, "\n".join(lines), samples=6) != []


def scoped(seed: int) -> str:
    """Return a random program: two scopes that share values, and steps between."""
    draw = random.Random(f"scoped:{seed}")
    lines = ["registers:", "  a: {width: 4, start: unknown}"]
    lines += ["  t: {width: 2, start: zero}", "steps:", "  - h: t"]
    count = draw.randint(1, 3)
    makes = []
    for wire in range(count):
        sources = [f"a.{i}" for i in draw.sample(range(4), 2)]
        if wire and draw.random() < 0.6:
            sources[0] = f"v.{wire - 1}"
        inverted = draw.choice(["", "not "])
        makes.append(
            f"        - and: {{controls: [{inverted}{sources[0]}, {sources[1]}], "
            f"into: v.{wire}}}"
        )
    for turn in range(2):
        lines += ["  - scope:", "      name: s", f"      workspace: {{v: {count}}}"]
        lines += ["      compute:", *makes, "      body:"]
        for _ in range(draw.randint(1, 4)):
            wire, goal = draw.randrange(count), draw.randrange(2)
            lines.append(
                draw.choice(
                    [
                        f"        - cx: v[{wire}], t[{goal}]",
                        f"        - h: t[{goal}]",
                        f"        - cz: v[{wire}], t[{goal}]",
                    ]
                )
            )
        if not turn and draw.random() < 0.5:
            lines.append(f"  - h: a[{draw.randrange(4)}]")
    return "\n".join(lines) + "\n"


@pytest.mark.parametrize("seed", range(4))
def test_random_scopes_plan_in_every_order(seed: int) -> None:
    program = read_program(scoped(seed), "scoped.yaml")
    device = ("tuff-10", "slate-16", "marl-32", "shale-12")[seed]
    costs = {}
    for asked in ("as-written", "at-once", "at-end", "optimised"):
        # Every plan is checked before it is handed out.
        plan = placer.plan(program, device, effort="quick", cleanup=asked)
        assert plan.cleanup is not None
        assert plan.cleanup.asked == asked
        costs[asked] = plan.figures.costs.total
    assert costs["optimised"] == min(costs.values())


def refuse(*finding: str) -> None:
    raise AssertionError(finding)


def measured(moves: Sequence[tuple[str, int]]) -> list[tuple[str, int]]:
    """Return the moves with every cleaning that is followed by a computing measured."""
    changed = []
    for place, (action, number) in enumerate(moves):
        if action == "uncompute" and ("compute", number) in moves[place:]:
            changed.append(("drop", number))
        else:
            changed.append((action, number))
    return changed


def test_every_order_of_random_scopes_computes_the_same() -> None:
    dropped = orders = 0
    for seed in range(30):
        program = read_program(scoped(seed), "scoped.yaml")
        device = find_device("quartzite-20" if seed % 2 else "tuff-10")
        graph = values_of(program)
        game = game_of(program, graph, device)
        for order in orders_of(program, game, graph, "quick")[0]:
            moves = [(str(a), n) for a, n in order.moves] or list(graph.written)
            for way in (moves, measured(moves)):
                assert follow_moves(program, way, device, refuse)
            orders += 1
            dropped += measured(moves) != moves
    assert orders > 60
    assert dropped > 30


def test_nothing_to_choose_says_nothing_about_cleanup() -> None:
    text = "registers: {a: {width: 3, start: unknown}}\nsteps:\n  - ccx: a\n"
    text = text.replace("ccx: a", "mcx: {controls: [a.0, a.1], target: a.2}")
    plan = placer.plan(read_program(text, "plain.yaml"), "tuff-10", effort="quick")
    assert plan.cleanup is None
    assert "cleanup" not in json.loads(placer.to_json(plan))


@pytest.mark.slow
@pytest.mark.parametrize("name", DEMOS)
def test_the_best_order_of_the_demos_beats_both_extremes(name: str) -> None:
    totals = {
        asked: placer.plan(name, "obsidian-36", cleanup=asked).figures.costs.total
        for asked in ("at-once", "at-end", "optimised")
    }
    assert totals["optimised"] < totals["at-once"]
    assert totals["optimised"] < totals["at-end"]
