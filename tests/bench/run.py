"""Run the benchmark: `python -m tests.bench.run [row ...]`; without rows, all of them.

Every row is appended to reports/bench.csv, then reports/benchmark.md and its plots are
written anew from the last result of each row.
"""

from __future__ import annotations

import csv
import json
import sys
from collections.abc import Callable
from pathlib import Path

from tests.bench import large, sites, small
from tests.bench.table import REPORTS, Result, append, timed, word

ROWS: dict[str, Callable[[], Result]] = {
    "proven-small": small.proven_small,
    "proven-large": small.proven_large,
    "against-optimum": small.against_optimum,
    "sixteen-calls": small.sixteen_calls,
    "nugent": sites.nugent_sites,
    "zero-swap-127": sites.zero_swap_127,
    "zero-swap-433": sites.zero_swap_433,
    "zero-swap-1121": sites.zero_swap_1121,
    "known-swaps": sites.known_swap_counts,
    "recipe-and-schedule": small.recipe_and_schedule,
    "trial-route": large.trial_route,
    "scale": large.scale,
    "first-fit": large.against_first_fit,
    "policies": large.against_policies,
}
POINTS = REPORTS / "bench-points.json"
TEXT = Path(__file__).with_name("benchmark-notes.md")


def main(names: list[str]) -> int:
    """Run rows by name and write the reports; return 0 if all were reached."""
    unknown = [name for name in names if name not in ROWS]
    if unknown:
        print(f"no such row: {', '.join(unknown)}; known: {', '.join(ROWS)}")
        return 2
    is_reached = True
    for name in names or list(ROWS):
        result = timed(ROWS[name])
        print(
            f"{result.row}: {result.measured}; target {result.target}: "
            f"{word(result.reached)} ({result.seconds:.0f} s)",
            flush=True,
        )
        append([result])
        _keep_points(name, result)
        is_reached = is_reached and result.reached is not False
    write_report()
    return 0 if is_reached else 1


def _keep_points(name: str, result: Result) -> None:
    points = json.loads(POINTS.read_text()) if POINTS.exists() else {}
    points[name] = result.points
    POINTS.write_text(json.dumps(points, indent=0, sort_keys=True) + "\n")


def write_report() -> None:
    """Write benchmark.md and the plots from the last result of each row."""
    with (REPORTS / "bench.csv").open(encoding="utf-8") as stream:
        last = {line["row"]: line for line in csv.DictReader(stream)}
    lines = [
        "# Benchmark",
        "",
        "The last result of each row; all results are in `bench.csv`. Repeat with "
        "`python -m tests.bench.run`; `tests/bench/README.md` describes the cases.",
        "Times are wall-clock on a machine shared with other work; 'references' is "
        "the time of the row in units of a fixed annealing run in the same process.",
        "",
        "| row | to reach | measured | reached | cases | s | references |",
        "|---|---|---|---|---|---|---|",
    ]
    for line in last.values():
        keys = ("row", "target", "measured", "reached", "cases", "seconds")
        lines.append("| " + " | ".join(line[k] for k in (*keys, "references")) + " |")
    some = next(iter(last.values()))
    lines += ["", f"Machine: {some['machine']}. Versions: {some['versions']}.", ""]
    lines += ["![Gaps](bench-gaps.svg)", "", "![Scaling](bench-scale.svg)", ""]
    if TEXT.exists():
        lines.append(TEXT.read_text(encoding="utf-8").rstrip("\n"))
    (REPORTS / "benchmark.md").write_text("\n".join(lines) + "\n", encoding="utf-8")
    _plots(json.loads(POINTS.read_text()))


def _plots(points: dict[str, list[tuple[str, float, float]]]) -> None:
    """Draw gaps between plans and bounds or least counts, and time by size."""
    import matplotlib as mpl

    mpl.use("svg")
    mpl.rcParams["svg.hashsalt"] = "bench"
    from matplotlib import pyplot

    figure, (left, right) = pyplot.subplots(1, 2, figsize=(9, 3.2))
    for name in ("against-optimum", "sixteen-calls", "recipe-and-schedule"):
        gaps = sorted(y for _, _, y in points.get(name, []))
        if gaps:
            left.plot(range(1, len(gaps) + 1), gaps, "o-", label=name)
    left.set_xlabel("case, best first")
    left.set_ylabel("gap between plan and bound")
    left.legend()
    series: dict[str, list[tuple[float, float]]] = {}
    for name, x, y in points.get("known-swaps", []):
        series.setdefault(name, []).append((x, y))
    for name, row in series.items():
        right.plot([x for x, _ in row], [y for _, y in row], "o-", label=name)
    right.axhline(1.0, color="grey", linewidth=0.8)
    right.set_xlabel("least number of swaps m")
    right.set_ylabel("swaps of the included route / m")
    if series:
        right.legend()
    figure.tight_layout()
    figure.savefig(REPORTS / "bench-gaps.svg", metadata={"Date": None})
    figure, axis = pyplot.subplots(figsize=(4.8, 3.2))
    rows = points.get("scale", [])
    axis.loglog([x for _, x, _ in rows], [y for _, _, y in rows], "o-")
    axis.set_xlabel("calls (433 sites, 200 wires)")
    axis.set_ylabel("seconds of a plan")
    figure.tight_layout()
    figure.savefig(REPORTS / "bench-scale.svg", metadata={"Date": None})


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
