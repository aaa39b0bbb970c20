"""Arithmetic from YAML to the placed file, held against plain integer arithmetic.

The placed file is run by a reader that knows nothing of the package; what must come
out is computed here from the words of each step, with Python's integers.
"""

from __future__ import annotations

import random
from collections.abc import Callable

import pytest

import placer
from placer.device.read import find_device
from placer.program.read import read_program
from placer.report.qasm import placed_qasm
from tests.replay_reader import Run, read

Values = dict[str, int]
WIDTHS = {"a": 3, "b": 3, "s": 3, "c": 1, "z": 1}
HEAD = """registers:
  a: {width: 3}
  b: {width: 3}
  s: {width: 3, start: zero}
  c:
  z:
steps:
"""


def put(values: Values, name: str, value: int) -> None:
    values[name] = value % (1 << WIDTHS[name])


def carrying(values: Values, name: str, amount: int) -> None:
    whole = (values["z"] << WIDTHS[name] | values[name]) + amount
    values["z"] = whole >> WIDTHS[name] & 1
    put(values, name, whole)


STEPS: dict[str, Callable[[Values], None]] = {
    "add: {value: a, into: b}": lambda v: put(v, "b", v["b"] + v["a"]),
    "add: {value: a, into: b, carry: z}": lambda v: carrying(v, "b", v["a"]),
    "add: {value: a, into: b, controls: c}": lambda v: put(
        v, "b", v["b"] + v["a"] * v["c"]
    ),
    "add: {value: 5, into: b}": lambda v: put(v, "b", v["b"] + 5),
    "subtract: {value: a, into: b}": lambda v: put(v, "b", v["b"] - v["a"]),
    "subtract: {value: 3, into: b, controls: not c}": lambda v: put(
        v, "b", v["b"] - 3 * (1 - v["c"])
    ),
    "sum: {left: a, right: b, into: s}": lambda v: put(v, "s", v["a"] + v["b"]),
    "increment: {target: b, carry: z}": lambda v: carrying(v, "b", 1),
    "decrement: a": lambda v: put(v, "a", v["a"] - 1),
    "less_than: {left: a, right: b, into: z}": lambda v: put(
        v, "z", v["z"] ^ (v["a"] < v["b"])
    ),
    "less_than: {left: a, right: 5, into: z, controls: c}": lambda v: put(
        v, "z", v["z"] ^ (v["a"] < 5 and v["c"])
    ),
    "equal: {left: a, right: b, into: z}": lambda v: put(
        v, "z", v["z"] ^ (v["a"] == v["b"])
    ),
    "lookup: {address: a, into: b, table: [3, 1, 4, 1, 5, 2, 6, 0]}": lambda v: put(
        v, "b", v["b"] ^ (3, 1, 4, 1, 5, 2, 6, 0)[v["a"]]
    ),
    "multiply_add: {left: 'a[0:1]', right: 'b[0:1]', into: s}": lambda v: put(
        v, "s", v["s"] + (v["a"] & 3) * (v["b"] & 3)
    ),
}


def run_placed(placed: str, start: Values, seed: int) -> Values:
    """Run the placed text on one basis input and return the registers."""
    text = read(placed)
    run = Run(text, set(), random.Random(seed))

    def site(name: str, place: int) -> int:
        wire = name if WIDTHS[name] == 1 else f"{name}[{place}]"
        return run.at(f"${text.layout[wire]}")

    key = 0
    for name, width in WIDTHS.items():
        for place in range(width):
            if start[name] >> place & 1:
                key |= site(name, place)
    run.state = {key: 1}
    run.all()
    found = {}
    for name, width in WIDTHS.items():
        bits = [run.constant(site(name, place)) for place in range(width)]
        assert None not in bits, "the result is not one basis state"
        found[name] = sum((bit or 0) << place for place, bit in enumerate(bits))
    return found


@pytest.mark.parametrize(
    "device", ["slate-16", pytest.param("marl-32", marks=pytest.mark.slow)]
)
@pytest.mark.parametrize("step", sorted(STEPS))
def test_one_call_computes_what_its_words_say(step: str, device: str) -> None:
    source = f"{HEAD}  - {step}\n"
    # Registers that no step touches still belong to the layout.
    source += "  - barrier: all\n"
    program = read_program(source, "call.yaml")
    plan = placer.plan(program, device, effort="quick")
    assert placer.check(placer.to_json(plan)).ok
    draw = random.Random(f"{step} {device}")
    for gates in ("toffoli", "clifford-t"):
        placed = placed_qasm(plan, program, find_device(device), gates=gates)
        for _ in range(4):
            start = {n: draw.randrange(1 << w) for n, w in WIDTHS.items()}
            start["s"] = 0
            wanted = dict(start)
            STEPS[step](wanted)
            assert run_placed(placed, start, draw.randrange(1 << 30)) == wanted


@pytest.mark.parametrize("policy", ["clean", "borrowed", "none"])
def test_a_program_of_many_kinds_is_planned_under_every_policy(policy: str) -> None:
    source = HEAD + (
        "  - add: {value: a, into: b}\n"
        "  - less_than: {left: b, right: 5, into: z}\n"
        "  - z: z\n"
        "  - less_than: {left: b, right: 5, into: z}\n"
        "  - increment: a\n"
    )
    plan = placer.plan(read_program(source, "mixed.yaml"), "slate-16", effort="quick")
    rows = {row.policy: row for row in plan.policies}
    assert rows[policy].possible, rows[policy].reason
    assert plan.figures.costs.total <= rows[policy].figures.costs.total
