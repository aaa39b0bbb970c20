"""Rows of the benchmark: targets, what was measured, and how they are written down."""

from __future__ import annotations

import csv
import os
import platform
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from importlib.metadata import version
from pathlib import Path

import numpy as np

from placer.device.lattices import heavy_hex
from placer.planner.anneal import Flow, anneal
from placer.version import VERSION

REPORTS = Path(__file__).resolve().parents[2] / "reports"
COLUMNS = [
    "date",
    "row",
    "target",
    "measured",
    "reached",
    "cases",
    "seconds",
    "references",
    "note",
    "machine",
    "versions",
]


@dataclass
class Result:
    """One row of the benchmark.

    `reached` is `None` where it is void: a plan failed its check, or data are missing.
    `points` are (series, x, y) for plots.
    """

    row: str
    target: str
    measured: str
    reached: bool | None
    cases: int
    note: str = ""
    seconds: float = 0.0
    references: float = 0.0
    points: list[tuple[str, float, float]] = field(default_factory=list)


def reference_seconds() -> float:
    """Return how long a fixed annealing of a ring on 127 sites takes here and now."""
    lattice = heavy_hex(7, 15)
    count = lattice.count
    hop = np.full((count, count), 60.0)
    for a, b in lattice.links:
        hop[a, b] = hop[b, a] = 1.0
    for k in range(count):
        hop = np.minimum(hop, hop[:, k : k + 1] + hop[k : k + 1, :])
    others = np.array([[(t - 1) % count, (t + 1) % count] for t in range(count)])
    offsets = np.arange(0, 2 * count + 1, 2, dtype=np.int64)
    size = 2 * count
    flow = Flow(
        offsets,
        others.ravel().astype(np.int64),
        np.ones(size),
        np.zeros(size, dtype=np.int64),
        np.zeros(size, dtype=np.int64),
        hop[None],
        np.zeros((count, count)),
    )
    anneal(flow, range(count), (offsets, flow.others), moves=1_000, seed=0)
    begin = time.perf_counter()
    anneal(flow, range(count), (offsets, flow.others), moves=1_000_000, seed=0)
    return time.perf_counter() - begin


def timed(measure: Callable[[], Result]) -> Result:
    """Return a row with its seconds, plain and in reference runs around it."""
    before = reference_seconds()
    begin = time.perf_counter()
    result = measure()
    result.seconds = time.perf_counter() - begin
    result.references = result.seconds / (0.5 * (before + reference_seconds()))
    return result


def machine() -> str:
    """Return the processor, the number of cores and the Python version."""
    name = platform.processor() or platform.machine()
    info = Path("/proc/cpuinfo")
    if info.exists():
        lines = [x for x in info.read_text().splitlines() if x.startswith("model name")]
        name = lines[0].split(":", 1)[1].strip() if lines else name
    return f"{name}, {os.cpu_count()} cores, Python {platform.python_version()}"


def versions() -> str:
    """Return the versions that matter for speed and for plans."""
    names = ("ortools", "numpy", "numba")
    return f"placer {VERSION}, " + ", ".join(f"{n} {version(n)}" for n in names)


def append(results: list[Result]) -> None:
    """Append rows to reports/bench.csv."""
    REPORTS.mkdir(exist_ok=True)
    path = REPORTS / "bench.csv"
    is_new = not path.exists()
    with path.open("a", newline="", encoding="utf-8") as stream:
        writer = csv.writer(stream)
        if is_new:
            writer.writerow(COLUMNS)
        for r in results:
            writer.writerow(
                [
                    time.strftime("%Y-%m-%d"),
                    r.row,
                    r.target,
                    r.measured,
                    word(r.reached),
                    r.cases,
                    f"{r.seconds:.1f}",
                    f"{r.references:.1f}",
                    r.note,
                    machine(),
                    versions(),
                ]
            )


def word(reached: bool | None) -> str:
    """Return yes, no or void."""
    return "void" if reached is None else "yes" if reached else "no"
