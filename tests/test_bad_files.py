"""Every bad file through the command line: status 2, the message, nothing written."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from click.testing import CliRunner

from placer.cli import main

FOLDER = Path(__file__).parent / "bad"
FILES = sorted(p for p in FOLDER.rglob("*") if p.is_file() and p.suffix != ".inc")


def expectation(path: Path) -> str:
    """Return the text that the first line of a bad file promises."""
    first = path.read_bytes().split(b"\n")[0].decode("utf-8", "replace")
    found = re.search(r"expect: (.*?)(?:\s+expect-line: \d+)?\s*(?:\*/)?$", first)
    return found.group(1).strip() if found else ""


def test_there_are_enough_bad_files() -> None:
    stated = [path for path in FILES if expectation(path)]
    assert len(stated) >= 60
    assert len({path.parent.name for path in stated}) >= 2


@pytest.mark.parametrize("path", FILES, ids=lambda p: f"{p.parent.name}-{p.name}")
def test_a_bad_file_exits_2_and_leaves_nothing(path: Path, tmp_path: Path) -> None:
    expected = expectation(path)
    if not expected:
        pytest.skip("no bad file by itself")
    is_device = path.parent.name == "device"
    program = "tide-gate" if is_device else str(path)
    device = str(path) if is_device else "slate-16"
    outputs = [tmp_path / "plan.json", tmp_path / "placed.qasm"]
    result = CliRunner().invoke(
        main,
        [
            "plan",
            program,
            "-d",
            device,
            "-q",
            "--plan",
            str(outputs[0]),
            "--qasm",
            str(outputs[1]),
        ],
    )
    assert result.exit_code == 2, result.output
    assert expected in result.stderr
    assert str(path) in result.stderr
    assert "error[" in result.stderr
    assert "Traceback" not in result.output
    assert result.stdout == ""
    assert list(tmp_path.iterdir()) == []
