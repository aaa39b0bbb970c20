"""Rules have one owner each; a few fine points that no other test comes near."""

from __future__ import annotations

import ast
import json
from pathlib import Path

import pytest

from placer.check import verify
from placer.check.plain import spelled_wrong
from placer.check.replay import ALL_ON, SAMPLES, counting_bits, random_bits
from placer.check.rules import NAMES, RULES
from placer.check.verify import check_plan
from placer.errors import InputError
from placer.program.model import PLAIN_GATES
from placer.recipes import standard
from tests.check.handmade import make
from tests.check.samples import ABLE, HEAD, LINE, device

ROOM = Path(verify.__file__).parent


def owners() -> dict[str, set[str]]:
    """Return, per rule, the functions of the room that speak its name."""
    found: dict[str, set[str]] = {name: set() for name in NAMES}
    for path in sorted(ROOM.glob("*.py")):
        if path.name == "rules.py":
            continue
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if not isinstance(node, ast.FunctionDef):
                continue
            for part in ast.walk(node):
                if isinstance(part, ast.Constant) and part.value in found:
                    found[part.value].add(f"{path.name}:{node.name}")
    return found


def test_every_rule_is_looked_after_by_one_function() -> None:
    several = {
        "source-changed": 2,
        "function-differs": 3,
        "cleanup-unreadable": 4,
        "value-read-dead": 2,
    }
    for rule, places in owners().items():
        assert len(places) == several.get(rule, 1), (rule, places)


def test_names_are_kebab_case_and_differ() -> None:
    assert len(set(NAMES)) == len(RULES)
    for rule in RULES:
        assert rule.name == rule.name.lower().replace("_", "-").replace(" ", "-")


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"format": 2}', "\0", "1e999"])
def test_what_is_no_plan_is_an_input_error(text: str) -> None:
    with pytest.raises(InputError):
        check_plan(text)


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("seed", 10**30),
        ("seed", 1.0),
        ("version", "\ud800"),
        ("open_inputs", 1),
        ("others", [[0, 0, True]]),
        ("others", [[0, 0]]),
        ("route", {"gaps": [], "swaps": [], "held_out": 0, "expected_swaps": -1}),
        ("route", None),
        ("bound", float("nan")),
    ],
)
def test_nonsense_is_malformed(key: str, value: object) -> None:
    data = json.loads(make(f"{HEAD}qubit q;\nh q;\n", LINE, name="one.qasm"))
    assert check_plan(json.dumps(data)).ok
    data[key] = value
    assert {f.rule for f in check_plan(json.dumps(data)).findings} == {"plan-malformed"}


def test_a_bit_is_written_last_by_the_same_measurement() -> None:
    source = f"{HEAD}qubit[2] q;\nbit c;\nc = measure q[0];\nc = measure q[1];\n"
    data = json.loads(make(source, LINE, name="bit.qasm"))
    assert check_plan(json.dumps(data)).ok
    # Each on its own wire: either order keeps the wires, not the bit.
    data["others"] = [[0, 300, 600], [1, 0, 300]]
    told = [f for f in check_plan(json.dumps(data)).findings if "bit c" in f.where]
    assert [f.rule for f in told] == ["function-differs"]


def test_measured_wires_are_used_again_only_where_the_device_can() -> None:
    unable = device(
        "{kind: line, sites: 3}",
        able=ABLE.replace("measurement: true", "measurement: false").replace(
            "conditional_latency_ns: 400", "conditional_latency_ns: none"
        ),
    )
    last = f"{HEAD}qubit q;\nbit c;\nh q;\nc = measure q;\n"
    assert check_plan(make(last, unable, name="last.qasm")).ok
    again = check_plan(make(f"{last}h q;\n", unable, name="again.qasm"))
    assert [f.rule for f in again.findings] == ["capability-missing"]


def test_the_last_bit_of_exp_may_differ_by_machine() -> None:
    data = json.loads(make(f"{HEAD}qubit[2] q;\nh q[0];\n", LINE, name="two.qasm"))
    for change, ok in ((1, True), (2, False)):  # one wait: that of q[1]
        other = json.loads(json.dumps(data))
        other["figures"]["costs"]["decay"] += change
        other["figures"]["cost"] += change
        assert check_plan(json.dumps(other)).ok == ok


def test_bits_count_and_are_repeatable() -> None:
    low, high = counting_bits(0), counting_bits(9)
    assert low == sum(1 << n for n in range(1, SAMPLES, 2))
    assert high == ALL_ON ^ (ALL_ON >> 512)
    assert random_bits(1, "a") == random_bits(1, "a") != random_bits(2, "a")
    # Samples of the last eighth are mostly ones, so that long products happen.
    rare = random_bits(3) >> (7 * SAMPLES // 8)
    assert rare.bit_count() > SAMPLES // 8 * 0.9


@pytest.mark.parametrize("name", sorted(PLAIN_GATES))
def test_plain_gates_are_spelled_out_rightly(name: str) -> None:
    params = (0.3, 1.1, -0.7)[: PLAIN_GATES[name][1]]
    ops = standard.lower(name, params).ops
    assert not spelled_wrong(name, params, ops)
    if PLAIN_GATES[name][0] == 2 and len(ops) > 1:
        assert spelled_wrong(name, params, ops[:-1])
