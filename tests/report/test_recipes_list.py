"""`placer show KIND --recipes`: every recipe, with counts that the circuits have."""

from __future__ import annotations

import json

import pytest
from click.testing import CliRunner

from placer.cli import main
from placer.device.read import find_device
from placer.program.model import CALL_KINDS
from placer.recipes import library
from placer.report.recipes import example_call, recipe_rows, recipes_text


@pytest.mark.parametrize("kind", CALL_KINDS)
def test_every_kind_lists_every_recipe_within_80_columns(kind: str) -> None:
    size = 3 if kind in ("lookup", "multiply_add") else 5
    names = library.names_for(example_call(kind, size))
    for device in (None, find_device("quartzite-20")):
        rows = recipe_rows(kind, size, device)
        assert [row["recipe"] for row in rows] == list(names)
        assert all(row["source"] for row in rows)
        text = recipes_text(kind, size, device)
        assert max(len(line) for line in text.splitlines()) <= 80
        joined = text.replace("\n", "").replace(" ", "")
        assert all(name in joined for name in names)


def test_counts_are_the_published_ones() -> None:
    # Clean ladder with relative phases: 6k-6 CNOT, 8k-9 T (Barenco et al. 1995,
    # Maslov 2016); k = 5.
    rows = {row["recipe"]: row for row in recipe_rows("mcx", 5, None)}
    assert rows["clean-ladder"]["two_body"] == 24
    assert rows["clean-ladder"]["t"] == 31
    assert rows["clean-ladder"]["clean"] == 3


def test_a_device_without_the_means_says_so() -> None:
    rows = {r["recipe"]: r for r in recipe_rows("mcx", 4, find_device("chert-27"))}
    assert rows["clean-measured"]["why_not"] == "no measured cleanup"
    assert rows["level2-chain"]["why_not"] == "no level 2"
    assert rows["clean-ladder"]["time_ns"] > 0


def test_the_command_lists_for_machines_and_refuses_nonsense() -> None:
    run = CliRunner()
    good = run.invoke(main, ["show", "add", "--recipes", "--size", "4", "--json"])
    assert good.exit_code == 0
    assert len(json.loads(good.stdout)["recipes"]) >= 5
    for words in (["show", "ad", "--recipes"], ["show", "lookup", "--recipes"]):
        bad = run.invoke(main, [*words, "--size", "40"])
        assert bad.exit_code == 2
        assert "error[" in bad.stderr


def is_beaten(row: dict[str, object], other: dict[str, object]) -> bool:
    needs = ("clean", "borrowed", "measures", "level2_wires")
    same = all(row[key] == other[key] for key in needs)
    return same and all(other[key] < row[key] for key in ("two_body", "depth"))


def test_a_recipe_that_another_beats_says_why_it_stays() -> None:
    beaten = set()
    for kind in CALL_KINDS:
        for size in (2, 3, 4, 5, 6, 8, 12, 16):
            if kind in ("lookup", "multiply_add") and size > 4:
                continue
            rows = recipe_rows(kind, size, None)
            for row in rows:
                if any(is_beaten(row, other) for other in rows):
                    assert row["kept_for"], (kind, size, row["recipe"])
                    beaten.add(row["recipe"].removeprefix("equal-"))
    assert beaten == set(library.KEPT_FOR)


def test_without_a_kind_every_kind_is_listed() -> None:
    run = CliRunner()
    text = run.invoke(main, ["show", "--recipes"])
    assert text.exit_code == 0
    assert all(kind in text.stdout for kind in CALL_KINDS)
    data = json.loads(run.invoke(main, ["show", "--recipes", "--json"]).stdout)
    assert set(data["kinds"]) == set(CALL_KINDS)
    assert "clean-ladder" in data["kinds"]["mcx"]
    for words in (["show"], ["show", "slate-16", "-d", "slate-16"]):
        assert run.invoke(main, words).exit_code == 2


def test_rows_hold_depths_and_lives_of_slots() -> None:
    # Live times of the clean ladder sum to (k-2)^2 Toffoli slots; here in gates, one
    # entry a slot.  Level-2 chain: 2k-1 two-body gates, depth the same.
    rows = {row["recipe"]: row for row in recipe_rows("mcx", 5, None)}
    assert len(rows["clean-ladder"]["live_gates"]) == 3
    assert rows["clean-ladder"]["t_depth"] > 0
    assert rows["level2-chain"]["two_body"] == rows["level2-chain"]["depth"] == 9
    assert rows["level2-chain"]["level2_window"] > 0
