"""Quantities read well and never lie at the edges."""

from __future__ import annotations

import pytest

from placer.report.words import (
    Page,
    bar,
    count,
    duration,
    listed,
    percent,
    plain,
    quantity,
)


@pytest.mark.parametrize(
    ("nanoseconds", "text"),
    [
        (0, "0 ns"),
        (35, "35 ns"),
        (999, "999 ns"),
        (1_000, "1 us"),
        (12_340, "12.3 us"),
        (254_100, "254 us"),
        (1_500_000, "1.5 ms"),
        (8_250_000_000, "8.25 s"),
    ],
)
def test_durations(nanoseconds, text):
    assert duration(nanoseconds) == text


@pytest.mark.parametrize(
    ("share", "text"),
    [
        (0, "0 %"),
        (1, "100 %"),
        (0.5, "50 %"),
        (0.1736, "17.4 %"),
        (0.99996, "99.996 %"),
        (0.999999999, "99.9999999 %"),
        (0.0001, "0.01 %"),
        (2.1e-6, "2.1e-04 %"),
        (1.043, "104 %"),
        (12.5, "1250 %"),
    ],
)
def test_percents(share, text):
    assert percent(share) == text


def test_other_quantities():
    assert quantity(12_340, "ns") == "12.3 us"
    assert quantity(0.5, "share") == "50 %"
    assert quantity(11, "sites") == "11 sites"
    assert count(1, "swap") == "1 swap"
    assert count(0, "swap") == "0 swaps"
    assert listed(["a", "b", "c"], 2) == "a, b and 1 more"
    assert bar(0, 10) == ""
    assert bar(0.001, 10) == "#"
    assert bar(1, 10) == "#" * 10


def test_names_cannot_steer_the_terminal():
    assert plain("a\x1b[31mb\n\u202ec") == "a [31mb  c"
    page = Page(60)
    page.table(("name", "x"), [("\x1b[2J[bold]q[/bold]", "1")])
    page.line("\x07bell")
    text = page.text()
    assert "\x1b" not in text
    assert "\x07" not in text
    assert "[bold]q[/bold]" in text


def test_columns_that_do_not_fit_are_dropped_in_order():
    page = Page(40)
    cells = ["first", *("x" * 12 for _ in range(3))]
    page.table(("a", "b", "c", "d"), [cells], drop=(2, 1))
    lines = page.text().splitlines()
    assert lines[0].split() == ["a", "b", "d"]
    assert all(len(line) <= 40 for line in lines)
