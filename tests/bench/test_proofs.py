"""How often the joint optimum is proven, by wires W, calls C and sites P.

Cases are drawn from fixed seeds: calls of two or three controls on random wires, on
lines and grids; every second device has unequal sites.
Run with `pytest -m bench tests/bench -s` to see the table.
"""

from __future__ import annotations

import random
import time

import pytest

from placer.device.read import read_device
from placer.planner.joint import everything, solve
from placer.planner.placement import make_instance
from placer.planner.policies import everything_allowed
from placer.planner.search import Amount, search
from placer.problem import make_problem
from placer.program.read import read_program
from placer.tables import device_tables

SMALL = [("line", "sites: 6"), ("line", "sites: 8"), ("grid", "rows: 3, columns: 3")]
LARGE = [
    ("line", "sites: 9"),
    ("grid", "rows: 3, columns: 4"),
    ("grid", "rows: 4, columns: 4"),
    ("grid", "rows: 5, columns: 5"),
]


def device_text(kind: str, size: str, draw: random.Random, uneven: int) -> str:
    lines = [
        "name: bench",
        "calibrated: 2026-01-01",
        f"lattice: {{kind: {kind}, {size}}}",
        "sites: {t1_us: 80, t2_us: 60, gate_error: 4e-4, gate_time_ns: 30, "
        "readout_error: 1e-2, readout_time_ns: 400}",
        "links: {error: 6e-3, time_ns: 60}",
        "capabilities: {mid_circuit_measurement: false, reset: false, "
        "conditional_latency_ns: none, level2_sites: none}",
    ]
    if uneven:
        lines.append("site_overrides:")
        lines += [f"  {p}: {{t1_us: {draw.randint(60, 110)}}}" for p in range(uneven)]
    return "\n".join(lines) + "\n"


def one_case(kind: str, size: str, wires: int, calls: int, seed: int) -> float | None:
    """Return the seconds of a proof, `None` where there is none."""
    draw = random.Random(seed)
    uneven = 6 if seed % 2 else 0
    device = read_device(device_text(kind, size, draw, uneven), "bench.yaml")
    steps = []
    for _ in range(calls):
        chosen = draw.sample(range(wires), draw.choice((3, 4)))
        operands = ", ".join(f"q[{w}]" for w in chosen)
        steps.append(f"ctrl({len(chosen) - 1}) @ x {operands};")
    head = f'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[{wires}] q;\n'
    text = head + "\n".join(steps) + "\n"
    problem = make_problem(device, read_program(text, "bench.qasm"))
    instance = make_instance(problem, device_tables(device))
    found = search(
        instance,
        everything_allowed(instance),
        amount=Amount(4, 60_000, (1.0, 0.4)),
        seed=0,
    )
    begin = time.perf_counter()
    answer = solve(
        instance, everything(instance), work=20.0, seed=0, hint=found[0].placement
    )
    seconds = time.perf_counter() - begin
    return seconds if answer.status == "best" else None


@pytest.mark.bench
@pytest.mark.parametrize(
    ("name", "shapes", "sizes", "count", "share", "limit"),
    [
        ("W<=5 C<=5 P<=9", SMALL, (4, 5), 24, 1.0, 10.0),
        ("W<=8 C<=8 P<=25", LARGE, (6, 8), 60, 0.95, 60.0),
    ],
)
def test_proven_share(
    name: str,
    shapes: list[tuple[str, str]],
    sizes: tuple[int, int],
    count: int,
    share: float,
    limit: float,
) -> None:
    one_case("line", "sites: 6", 4, 3, 0)  # compile first
    times = []
    for seed in range(count):
        kind, size = shapes[seed % len(shapes)]
        draw = random.Random(seed)
        wires, calls = draw.randint(*sizes), draw.randint(*sizes)
        times.append(one_case(kind, size, wires, calls, seed))
    proven = [t for t in times if t is not None and t <= limit]
    print(f"\n{name}: {len(proven)} of {count} proven, worst {max(proven):.1f} s")
    assert len(proven) >= share * count
