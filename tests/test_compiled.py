"""Compiled functions give the same with, without and after a change of the cache."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import numba
import pytest

from placer import compiled as room
from placer.compiled import compiled


def double(x: int) -> int:
    return 2 * x


def test_it_computes() -> None:
    assert compiled(double)(21) == 42


def test_without_a_place_for_the_cache(monkeypatch: pytest.MonkeyPatch) -> None:
    genuine = numba.njit

    def refuse(*args, **options):
        if options.get("cache"):
            raise RuntimeError("cannot cache function: no locator available")
        return genuine(*args, **options)

    monkeypatch.setattr(numba, "njit", refuse)
    assert compiled(double)(4) == 8


def test_a_change_in_a_called_file_is_seen(tmp_path: Path) -> None:
    """The caller's file stays the same; what it calls changes."""
    package = tmp_path / "placer"
    package.mkdir()
    (package / "__init__.py").write_text("")
    for name in ("compiled.py", "placed.py"):
        text = Path(room.__file__).with_name(name).read_text()
        (package / name).write_text(text)
    (package / "outer.py").write_text(
        "from placer.compiled import compiled\n"
        "from placer.helper import change\n\n"
        "@compiled\ndef run(x):\n    return change(x)\n"
    )
    found = []
    for factor in (2, 3):
        (package / "helper.py").write_text(
            "from placer.compiled import inner\n\n"
            f"@inner\ndef change(x):\n    return {factor} * x\n"
        )
        done = subprocess.run(
            [sys.executable, "-c", "from placer.outer import run; print(run(5))"],
            cwd=tmp_path,
            env={**os.environ, "PYTHONPATH": str(tmp_path)},
            capture_output=True,
            text=True,
            check=True,
        )
        found.append(done.stdout.strip())
    assert found == ["10", "15"]
