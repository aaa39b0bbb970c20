"""Every file of `tests/bad/program` has one fault, which its first line names."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from placer.errors import InputError
from placer.program.read import load_program

FOLDER = Path(__file__).parent.parent / "bad" / "program"
FILES = sorted(FOLDER.iterdir())
FIRST = re.compile(r"(?://|#) expect: (.*) expect-line: ([0-9]+)")


def test_there_are_many():
    assert len(FILES) >= 40


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.name)
def test_bad_program(path):
    match = FIRST.fullmatch(path.read_text(encoding="utf-8").split("\n", 1)[0])
    assert match is not None
    with pytest.raises(InputError) as caught:
        load_program(path)
    (fault,) = caught.value.faults
    assert match[1] in str(fault)
    assert fault.place.line == int(match[2])
    assert fault.place.file == str(path)
