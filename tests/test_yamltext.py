"""YAML text to nodes: places, strict keys, no guessed types, no surprises."""

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from placer.errors import Fault, InputError, Place
from placer.yamltext import DEEPEST, LARGEST_TEXT, Faults, Node, parse, raise_if_any


def scalar(text: str) -> Node:
    return parse(f"- {text}", "f.yaml").items[0]


def root_or_faults(text: str) -> Node | tuple[Fault, ...]:
    try:
        return parse(text, "f.yaml")
    except InputError as error:
        return error.faults


def refusal(text: str) -> tuple[Fault, ...]:
    with pytest.raises(InputError) as caught:
        parse(text, "f.yaml")
    return caught.value.faults


def test_nodes_know_their_place_and_label() -> None:
    root = parse("a: 1\nbig:\n  - x\n  - {y: [2, 3]}\n", "f.yaml")
    fields = root.mapping([])
    assert fields is not None
    assert list(fields) == ["a", "big"]
    assert fields["a"].place == Place("f.yaml", 1, 4)
    assert root.key_place("big") == Place("f.yaml", 2, 1)
    assert root.key_place("none") == root.place
    second = fields["big"].items[1]
    assert (second.label, second.place.line, second.place.column) == ("big[1]", 4, 5)
    inner = second.entries[0][1].items[1]
    assert (inner.label, str(inner.place)) == ("y[1]", "f.yaml:4:13")


@pytest.mark.parametrize(
    ("text", "number", "whole"),
    [
        ("50", 50.0, 50),
        ("-3", -3.0, -3),
        ("+3", 3.0, 3),
        ("0", 0.0, 0),
        ("1e6", 1e6, 1_000_000),
        ("12E+2", 1200.0, 1200),
        ("1e-3", 1e-3, None),
        ("2.5", 2.5, None),
        (".5", 0.5, None),
        ("5.", 5.0, None),
        ("1e20", 1e20, 10**20),
        (
            "123456789012345678901234567890",
            1.2345678901234568e29,
            int("1234567890" * 3),
        ),
    ],
)
def test_numbers(text: str, number: float, whole: int | None) -> None:
    faults: Faults = []
    assert scalar(text).number(faults) == number
    assert faults == []
    assert scalar(text).whole(faults) == whole
    assert bool(faults) == (whole is None)


@pytest.mark.parametrize(
    ("text", "help"),
    [
        ("1_000", "write 1000"),
        ("'50'", "write 50 without quotes"),
        ("007", "without leading zeros"),
        ("0x1f", "write a number"),
        ("12:30", "write a number"),
        (".inf", "write a number"),
        ("nan", "write a number"),
        (".", "write a number"),
        ("e5", "write a number"),
        ("1e", "write a number"),
        ("--1", "write a number"),
        ("٣", "write a number"),
        ("on", "write a number"),
        ("~", "write a number"),
        ("[1]", "write a number"),
        ("1e99999", "write a number"),
    ],
)
def test_what_is_no_number(text: str, help: str) -> None:
    faults: Faults = []
    assert scalar(text).number(faults) is None
    assert scalar(text).whole(faults) is None
    assert len(faults) == 2
    assert all(help in fault.help for fault in faults)


def test_numbers_too_large_for_their_kind() -> None:
    faults: Faults = []
    assert scalar("1e999").number(faults) is None
    assert scalar("9" * 5000).whole(faults) is None
    assert [fault.code for fault in faults] == ["out-of-range", "out-of-range"]


@pytest.mark.parametrize(
    ("limits", "inside", "outside", "words"),
    [
        ({"low": 1}, "1", "0.999", "at least 1"),
        ({"high": 1}, "1", "1.001", "at most 1"),
        ({"above": 1}, "1.001", "1", "above 1"),
        ({"below": 1}, "0.999", "1", "below 1"),
    ],
)
def test_limits(
    limits: dict[str, float], inside: str, outside: str, words: str
) -> None:
    faults: Faults = []
    assert scalar(inside).number(faults, **limits) == float(inside)
    assert faults == []
    assert scalar(outside).number(faults, **limits) is None
    assert faults[0].what == f"item[0] is {outside}, must be {words}"


def test_limits_of_whole_numbers() -> None:
    faults: Faults = []
    assert scalar("3").whole(faults, low=3, high=3) == 3
    assert scalar("4").whole(faults, low=1, high=3) is None
    assert scalar("0").whole(faults, low=1) is None
    assert [fault.what for fault in faults] == [
        "item[0] is 4, must be 1 to 3",
        "item[0] is 0, must be at least 1",
    ]


def test_flags_are_true_and_false_only() -> None:
    faults: Faults = []
    assert scalar("true").flag(faults) is True
    assert scalar("false").flag(faults) is False
    assert faults == []
    for text in ("yes", "on", "True", "'true'", "1", "~", "[true]"):
        assert scalar(text).flag(faults) is None
    assert len(faults) == 7


def test_texts_come_as_written() -> None:
    for text in ("0101", "on", "1e6", "2026-01-05", "none"):
        assert scalar(text).text([]) == text
    assert scalar("'~'").text([]) == "~"
    assert scalar("''").text([]) == ""
    faults: Faults = []
    for text in ("~", "null", "", "[a]", "{a: b}"):
        assert scalar(text).text(faults) is None
    assert len(faults) == 5
    assert "empty" in faults[0].what


def test_choices_suggest_the_nearest_word() -> None:
    faults: Faults = []
    assert scalar("grid").choice(faults, ("grid", "line")) == "grid"
    assert scalar("gird").choice(faults, ("grid", "line")) is None
    assert scalar("[grid]").choice(faults, ("grid", "line")) is None
    assert faults[0].help == "did you mean 'grid'?"
    assert len(faults) == 2


def test_mapping_is_strict_and_finds_everything() -> None:
    faults: Faults = []
    root = parse("name: a\nsite: 4\nname: b\n? [x]\n: 1\nzzz: 2\n", "f.yaml")
    fields = root.mapping(faults, keys=("name", "sites"), required=("name", "sites"))
    assert fields is not None
    assert fields["name"].value == "a"
    assert [(f.place.line, f.code) for f in sorted(faults)] == [
        (1, "missing-key"),
        (2, "unknown-key"),
        (3, "repeated-key"),
        (4, "bad-key"),
        (6, "unknown-key"),
    ]
    helps = {fault.place.line: fault.help for fault in faults}
    assert helps[2] == "did you mean 'sites'?"
    assert helps[6] == "known keys: name, sites"
    assert "first in line 1" in next(f.what for f in faults if f.place.line == 3)
    with pytest.raises(InputError) as caught:
        raise_if_any(faults)
    assert len(caught.value.faults) == 5
    raise_if_any([])


def test_wrong_shapes() -> None:
    faults: Faults = []
    assert scalar("5").mapping(faults) is None
    assert scalar("5").sequence(faults) is None
    assert scalar("[1, 2]").sequence(faults, most=1) is None
    assert scalar("[]").sequence(faults, least=1) is None
    assert scalar("[1, 2]").sequence(faults, least=2, most=2) is not None
    assert len(faults) == 4


@pytest.mark.parametrize(
    ("text", "code", "place"),
    [
        ("", "empty-file", "f.yaml:1:1"),
        ("# only words\n", "empty-file", "f.yaml:1:1"),
        ("a: 1\n---\nb: 2", "several-documents", "f.yaml:2:1"),
        ("a: &x 1", "anchor", "f.yaml:1:4"),
        ("a: !!int 3", "tag", "f.yaml:1:4"),
        ("a: !own 3", "tag", "f.yaml:1:4"),
        ("a:\n\t- 1", "bad-yaml", "f.yaml:2:1"),
        ("a: b: c", "bad-yaml", "f.yaml:1:5"),
        ("a: 'x", "bad-yaml", "f.yaml:1:6"),
        ("a: 1\nb: \x00", "bad-text", "f.yaml:2:4"),
        ('a: "\\ud800"', "bad-text", "f.yaml:1:4"),
        ('"\\UFFFFFFFF"', "bad-yaml", "f.yaml:1:1"),
        ("%YAML 1." + "9" * 5000 + "\n--- 1", "bad-yaml", "f.yaml:1:1"),
        ("[" * 100_000, "too-deep", f"f.yaml:1:{DEEPEST + 1}"),
        ("- " * 1000 + "x", "too-deep", f"f.yaml:1:{2 * DEEPEST + 1}"),
        ("x" * (LARGEST_TEXT + 1), "too-large", "f.yaml"),
    ],
)
def test_texts_that_are_refused(text: str, code: str, place: str) -> None:
    faults = refusal(text)
    assert (faults[0].code, str(faults[0].place)) == (code, place)


def test_alias_bomb_is_refused_at_once() -> None:
    lines = ["a0: &a0 [x, x]"]
    lines += [f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 9)}]" for n in range(1, 30)]
    faults = refusal("\n".join(lines))
    assert {fault.code for fault in faults} == {"anchor", "alias"}
    assert len(faults) == 30 + 29 * 9


@given(st.text(max_size=300))
@example("? ? ?")
@example("{a, b: }")
@example("--- |\n x\n...")
@example("%TAG ! x\n---\n!x 1")
@example("x: !<%zz> 1")
@example("\ufeffa: 1")
def test_random_text_is_read_or_refused(text: str) -> None:
    root = root_or_faults(text)
    if not isinstance(root, Node):
        assert root
        return
    faults: Faults = []
    root.mapping(faults, keys=("a",), required=("a",))
    root.sequence(faults, least=1)
    for ask in (root.text, root.number, root.whole, root.flag):
        ask(faults)
    assert len(str(InputError(faults))) < 10_000


@given(
    st.text(
        st.sampled_from("ab:- \n{}[],'\"#&*!|>%@`?0123456789.eE+_~<=\t\\"), max_size=60
    )
)
def test_yaml_like_text_is_read_or_refused(text: str) -> None:
    root = root_or_faults(text)
    if not isinstance(root, Node):
        assert root
        assert all(fault.place.line > 0 for fault in root)
