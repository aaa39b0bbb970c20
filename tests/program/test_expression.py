"""Constant expressions, against the same formula in Python."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from placer.errors import InputError
from placer.program.expression import evaluate
from placer.program.read import read_program
from placer.program.tokens import Reader, read_expression


def no_names(name, place):
    raise InputError.at(place, "undeclared", name)


def value(text, dialect="openqasm2"):
    return evaluate(read_expression(Reader(text, "p")), no_names, dialect)


def value_3(text):
    """Return a value by way of the reference parser: an angle of a gate."""
    source = f"OPENQASM 3.0;\nqubit q;\nctrl @ gphase({text}) q;"
    operations = read_program(source, "p.qasm").operations
    return operations[0].params[0] if operations else 0.0


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("1", 1),
        ("-2^2", -4),
        ("2^3^2", 512),
        ("2^-1", 0.5),
        ("1/2", 0.5),
        ("8/2/2", 2),
        ("1-2-3", -4),
        ("2+3*4", 14),
        ("(2+3)*4", 20),
        ("--1", 1),
        ("-(-1)", 1),
        ("3*-2", -6),
        ("pi", math.pi),
        ("cos(pi)+exp(0)*ln(1)", -1),
        ("sqrt(2)^2", 2),
        ("tan(0.5)", math.tan(0.5)),
        (".5e1", 5),
        ("1.", 1),
    ],
)
def test_version_2(text, expected):
    assert value(text) == pytest.approx(expected, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("2 ** 3 ** 2", 512),
        ("6 ^ 3", 5),
        ("6 & 3 | 8", 10),
        ("1 << 4 >> 1", 8),
        ("7 % 4", 3),
        ("-7 % 4", -3),
        ("7.0 / 2", 3.5),
        ("6 / 2", 3),
        ("tau / 2 - π", 0.0),
        ("euler", math.e),
        ("0x1F + 0b11 + 0o7", 41),
        ("1_000", 1000),
        ("arccos(0) + arcsin(1) + arctan(0)", math.pi),
        ("float(3) / 2", 1.5),
        ("int(2.9)", 2),
        ("ceiling(1.2) + floor(1.8)", 3),
        ("log(euler)", 1),
        ("true + true", 2),
    ],
)
def test_version_3(text, expected):
    assert value_3(text) == pytest.approx(expected, rel=1e-15)


@pytest.mark.parametrize(
    "text", ["1/0", "sqrt(-1)", "ln(0)", "(-8)^0.5", "10.0^400", "exp(1000)", "0^-1"]
)
def test_no_value(text):
    with pytest.raises(InputError, match=r"no value|no finite"):
        value(text)


@pytest.mark.parametrize("text", ["7 / 2", "~1", "!true", "1 < 2", "sizeof(q)", "1im"])
def test_refused_in_version_3(text):
    with pytest.raises(InputError):
        value_3(text)


@st.composite
def formulas(draw, depth=0):
    """Return a formula that means the same in Python, save for the power sign."""
    if depth > 3 or draw(st.booleans()):
        return draw(st.sampled_from(["1", "2.5", "3", "0.125", "7", "1e-1"]))
    left, right = draw(formulas(depth + 1)), draw(formulas(depth + 1))
    shape = draw(
        st.sampled_from(["{}+{}", "{}-{}", "{}*{}", "{}/{}", "({})*({})", "-{}"])
    )
    return shape.format(left, right)


@settings(max_examples=300, deadline=None, derandomize=True)
@given(formulas())
def test_formulas_agree_with_python(text):
    expected = eval(text, {"__builtins__": {}})
    assert value(text) == pytest.approx(expected, rel=1e-12)
