"""Random programs become what they say; random text never does anything unforeseen."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from program_texts import programs

from placer.errors import InputError
from placer.program.read import read_program

BAD = Path(__file__).parent.parent / "bad" / "program"
SEEDS = [
    path.read_text(encoding="utf-8")
    for path in sorted(BAD.iterdir())
    if "too_deep" not in path.name and "include" not in path.name
]
WORDS = [
    "OPENQASM",
    "2.0",
    "3.0",
    ";",
    ",",
    "(",
    ")",
    "[",
    "]",
    "{",
    "}",
    "->",
    "=",
    "@",
    "ctrl",
    "inv",
    "pow(2)",
    "gate",
    "qreg",
    "creg",
    "qubit",
    "bit",
    "measure",
    "reset",
    "barrier",
    "for",
    "in",
    "let",
    "const",
    "int",
    "if",
    "include",
    "x",
    "cx",
    "ccx",
    "rz",
    "pi",
    "q",
    "c",
    "a",
    "0",
    "1",
    "7",
    "-1",
    ":",
    "++",
    "+",
    "-",
    "*",
    "/",
    "^",
    "**",
    "//",
    "@placer.workspace",
    "@placer.keep",
    "init=zero",
    '"qelib1.inc"',
    "$0",
    "\n",
    ".",
    "é",
    "π",
    "\ufeff",
]
YAML_WORDS = [
    "registers",
    "steps",
    "a",
    "b",
    "t:",
    "-",
    ":",
    ",",
    "[",
    "]",
    "{",
    "}",
    "cx",
    "h",
    "mcx",
    "controls",
    "target",
    "scope",
    "compute",
    "body",
    "workspace",
    "width",
    "2",
    "and",
    "into",
    "a.0",
    "a[0]",
    "not",
    "!",
    "repeat",
    "times",
    "&",
    "*",
    "|",
    ">",
    "'",
    '"',
    "#",
    "\n",
    "\n",
    "",
    "\n-",
    "pi/2",
    "-1",
    "1e9",
    "~",
    "null",
    "true",
    "bits",
    "measure",
    "from",
]
QUICK = settings(
    max_examples=300,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.too_slow],
)
LONG = settings(QUICK, max_examples=10_000, derandomize=False)


def found(program):
    return [
        (op.name, tuple(program.wire_names[w] for w in op.wires), op.params, op.bit)
        for op in program.operations
    ]


def check_random_program(text):
    program = read_program(text.source, "p.qasm")
    assert program.syntax == f"openqasm{text.version}"
    result = found(program)
    assert [row[:2] + row[3:] for row in result] == [
        row[:2] + row[3:] for row in text.expected
    ]
    for row, expected in zip(result, text.expected, strict=True):
        assert len(row[2]) == len(expected[2])
        for value, other in zip(row[2], expected[2], strict=True):
            assert math.isclose(value, other, rel_tol=1e-12)
    assert [op.index for op in program.operations] == list(range(len(result)))


def faults_of(text, path):
    try:
        read_program(text, path)
    except InputError as error:
        return error.faults or (None,)
    return ()


def check_any_text(text, path):
    """A text is read or refused with places; nothing else may happen."""
    for fault in faults_of(text, path):
        assert fault.what
        assert fault.place.file == path
        assert fault.place.line <= text.count("\n") + 1


@QUICK
@given(programs())
def test_random_program(text):
    check_random_program(text)


def test_every_kind_of_statement_is_drawn():
    seen: set[str] = set()

    @settings(QUICK, max_examples=100)
    @given(programs())
    def draw(text):
        seen.update(text.kinds)
        seen.add(str(text.version))

    draw()
    assert len(seen) == 13


@st.composite
def mutated(draw, ending=".qasm"):
    """Return a program of the bad folder with a few pieces taken, doubled or added."""
    seeds = [seed for seed in SEEDS if seed.startswith("#") == (ending == ".yaml")]
    text = draw(st.sampled_from(seeds))
    for _ in range(draw(st.integers(1, 4))):
        low = draw(st.integers(0, len(text)))
        high = min(len(text), low + draw(st.integers(0, 12)))
        words = WORDS if ending == ".qasm" else YAML_WORDS
        piece = draw(st.sampled_from(["", text[low:high] * 2, *words]))
        text = text[:low] + piece + text[high:]
    return text


@QUICK
@given(mutated())
def test_mutated_qasm(text):
    check_any_text(text, "p.qasm")


@QUICK
@given(mutated(".yaml"))
def test_mutated_yaml(text):
    check_any_text(text, "p.yaml")


@QUICK
@given(st.lists(st.sampled_from(WORDS), max_size=30), st.sampled_from("23"))
def test_random_words(words, version):
    check_any_text(f"OPENQASM {version}.0;\n" + " ".join(words), "p.qasm")


@QUICK
@given(st.text(max_size=60), st.sampled_from(["p.qasm", "p.yaml"]))
def test_random_letters(text, path):
    check_any_text(text, path)


@pytest.mark.slow
@LONG
@given(programs())
def test_many_random_programs(text):
    check_random_program(text)


@pytest.mark.slow
@LONG
@given(st.one_of(mutated(), mutated(".yaml")))
def test_many_mutations(text):
    check_any_text(text, "p.yaml" if text.startswith("#") else "p.qasm")


@pytest.mark.slow
@LONG
@given(st.lists(st.sampled_from(WORDS), max_size=40), st.sampled_from("23"))
def test_many_random_words(words, version):
    check_any_text(f"OPENQASM {version}.0;\n" + " ".join(words), "p.qasm")
