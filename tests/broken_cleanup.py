"""Spoil the cleanup of a good plan: its moves, its rows, or the program made of it."""

from __future__ import annotations

import copy
import random
from collections.abc import Callable
from dataclasses import replace
from typing import Any

from placer.program.model import Program
from placer.program.read import read_program
from placer.program.values import values_of
from tests.broken_sources import Data


def _moves(data: Data) -> tuple[Data, list[list[Any]]] | None:
    """Return a copy with its moves, where the plan has any."""
    if not data.get("cleanup", {}).get("moves"):
        return None
    spoiled = copy.deepcopy(data)
    return spoiled, spoiled["cleanup"]["moves"]


def unreadable(data: Data, draw: random.Random) -> Data | None:
    found = _moves(data)
    if found is None:
        return None
    spoiled, moves = found
    uses = [n for n, (action, _) in enumerate(moves) if action == "use"]
    if draw.random() < 0.5:
        moves[draw.choice(uses)][1] = 10**6
    else:
        # What is there already cannot be computed.
        place = draw.choice([n for n, (a, _) in enumerate(moves) if a == "compute"])
        moves.insert(place + 1, list(moves[place]))
    return spoiled


def read_dead(data: Data, draw: random.Random) -> Data | None:
    """Let a value go before the move that reads it."""
    found = _moves(data)
    if found is None:
        return None
    spoiled, moves = found
    ends = [
        n
        for n, (action, _) in enumerate(moves)
        if action in ("uncompute", "drop") and moves[n - 1][0] == "use"
    ]
    place = draw.choice(ends)
    move = moves.pop(place)
    made = max(n for n in range(place) if moves[n] == ["compute", move[1]])
    moves.insert(made + 1, move)
    return spoiled


def input_changed(data: Data, draw: random.Random) -> Data | None:
    """Clean a value up after its inputs have changed."""
    found = _moves(data)
    if found is None:
        return None
    spoiled, moves = found
    source = data["program"]
    graph = values_of(read_program(source["text"], source["path"]))
    ends = [
        n
        for n, (action, number) in enumerate(moves)
        if action == "uncompute" and graph.values[number].window[1] < len(graph.uses)
    ]
    moves.append(moves.pop(draw.choice(ends)))
    return spoiled


def record_open(data: Data, draw: random.Random) -> Data | None:
    """Measure a value away at the end instead of cleaning it up."""
    found = _moves(data)
    if found is None:
        return None
    spoiled, moves = found
    last = {number: n for n, (action, number) in enumerate(moves) if action != "use"}
    ends = [n for n in last.values() if moves[n][0] == "uncompute"]
    moves[draw.choice(ends)][0] = "drop"
    return spoiled


def value_left(data: Data, draw: random.Random) -> Data | None:
    """Forget the last cleaning of a value."""
    found = _moves(data)
    if found is None:
        return None
    spoiled, moves = found
    last = {number: n for n, (action, number) in enumerate(moves) if action != "use"}
    ends = [n for n in last.values() if moves[n][0] == "uncompute"]
    del moves[draw.choice(ends)]
    return spoiled


def misstated(data: Data, draw: random.Random) -> Data | None:
    if "cleanup" not in data:
        return None
    spoiled = copy.deepcopy(data)
    cleanup = spoiled["cleanup"]
    chosen = next(r for r in cleanup["rows"] if r["name"] == cleanup["chosen"])
    ways: list[Callable[[], object]] = [
        lambda: cleanup.update(chosen="within 99 wires"),
        lambda: cleanup["values"][0].update(size=9),
        lambda: chosen.update(fits=not chosen["fits"]),
        lambda: chosen["figures"].update(swaps=chosen["figures"]["swaps"] + 1),
    ]
    draw.choice(ways)()
    return spoiled


def forgotten_fix(program: Program, draw: random.Random) -> Program | None:
    """Leave out an operation that a value is made, cleaned up or fixed with."""
    places = [op.index for op in program.operations if op.part and op.kind != "reset"]
    gone = draw.choice(places)
    kept = [op for op in program.operations if op.index != gone]
    return replace(
        program,
        operations=tuple(replace(op, index=n) for n, op in enumerate(kept)),
    )


CLEANUP_BREAKERS = {
    "cleanup-unreadable": unreadable,
    "value-read-dead": read_dead,
    "cleanup-input-changed": input_changed,
    "record-open": record_open,
    "value-left": value_left,
    "cleanup-misstated": misstated,
}
REWRITE_BREAKERS = {"cleanup-differs": forgotten_fix}

CLEANUP_FOLLOWS: dict[str, set[str]] = {
    "value-read-dead": {"cleanup-unreadable"},
    "cleanup-input-changed": {"value-read-dead", "cleanup-unreadable"},
    # What is measured away or left cannot be read, made or cleaned up any more.
    "record-open": {"cleanup-unreadable"},
    "value-left": {"cleanup-unreadable", "value-read-dead"},
}
