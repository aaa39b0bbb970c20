"""The rows of the benchmark as tests: `pytest -m bench tests/bench`.

`python -m tests.bench.run` runs the same rows and writes the reports.
"""

from __future__ import annotations

import pytest

from tests.bench.run import ROWS
from tests.bench.table import timed

# Rows that this engine does not reach; reports/benchmark.md has figures and reasons.
MISSED: frozenset[str] = frozenset()


@pytest.mark.bench
@pytest.mark.parametrize("name", sorted(ROWS))
def test_row(name: str) -> None:
    result = timed(ROWS[name])
    print(f"\n{result.row}: {result.measured} (to reach: {result.target})")
    if result.reached is None:
        pytest.skip(result.measured)
    if name in MISSED and not result.reached:
        pytest.xfail(result.measured)
    assert result.reached, result.measured
