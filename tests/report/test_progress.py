"""The progress line: one line on a terminal, rare lines elsewhere, none when quiet."""

from __future__ import annotations

import io

import pytest

from placer.report import progress
from placer.report.progress import Progress


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


@pytest.fixture
def clock(monkeypatch):
    now = [100.0]
    monkeypatch.setattr(progress.time, "monotonic", lambda: now[0])
    return now


def test_elsewhere_lines_are_rare(clock):
    stream = io.StringIO()
    with Progress(stream) as tell:
        tell("short work says nothing")
        clock[0] += 6
        tell("one\x1b[2J")
        tell("too soon")
        clock[0] += 6
        tell("two")
    assert stream.getvalue() == "placer: one [2J\nplacer: two\n"


def test_on_a_terminal_the_line_is_rewritten_and_taken_away(clock):
    stream = Terminal()
    with Progress(stream) as tell:
        tell("one")
        clock[0] += 1
        tell("x" * 500)
    text = stream.getvalue()
    assert text.startswith("\r\x1b[Kone\r\x1b[Kxxx")
    assert text.endswith("\r\x1b[K")
    assert "\n" not in text
    assert max(map(len, text.split("\r\x1b[K"))) < 500


def test_quiet_says_nothing(clock):
    stream = Terminal()
    with Progress(stream, is_quiet=True) as tell:
        clock[0] += 60
        tell("one")
    assert stream.getvalue() == ""
