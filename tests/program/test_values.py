"""Values of programs: what makes them, what they are made from, who needs them."""

from __future__ import annotations

import pytest

from placer.device.read import find_device
from placer.errors import InputError
from placer.program.planned import planned_program
from placer.program.read import read_program
from placer.program.rewrite import Move, rewritten
from placer.program.values import ValueGraph, values_of

HEAD = """\
registers:
  a: {width: 4, start: unknown}
  t: {width: 3, start: zero}
steps:
"""
SCOPE = """\
  - scope:
      name: s
      workspace: {v: 2}
      compute:
        - and: {controls: [a.0, not a.1], into: v.0}
        - and: {controls: [v.0, a.2], into: v.1}
      body:
        - cx: v[1], t[0]
"""


def graph(text: str) -> ValueGraph:
    return values_of(read_program(HEAD + text, "values.yaml"))


def test_each_written_wire_is_a_value_computed_from_others() -> None:
    found = graph(SCOPE)
    assert [v.name for v in found.values] == ["s_1.v[0]", "s_1.v[1]"]
    # x, and, x: the frame of 'not a.1' belongs to the value it is for.
    assert [len(v.steps) for v in found.values] == [3, 1]
    assert [v.inputs for v in found.values] == [(), (0,)]
    assert [u.needs for u in found.uses] == [(1,)]
    moves = [("compute", 0), ("compute", 1), ("use", 0)]
    assert found.written == (*moves, ("uncompute", 1), ("uncompute", 0))


def test_equal_values_of_two_scopes_are_one_until_an_input_changes() -> None:
    again = graph(SCOPE + SCOPE)
    assert len(again.values) == 2
    assert [u.needs for u in again.uses] == [(1,)]
    changed = graph(SCOPE + "  - h: a[2]\n" + SCOPE)
    # v[0] does not read a[2] and is the same; v[1] is another value after the h.
    assert [v.name for v in changed.values] == ["s_1.v[0]", "s_1.v[1]", "s_2.v[1]"]
    assert changed.values[1].window == (0, 1)
    assert changed.values[2].window == (2, 3)


def test_what_is_changed_after_it_was_read_belongs_together() -> None:
    found = graph(
        """\
  - scope:
      workspace: {v: 2}
      compute:
        - cx: a[0], v[0]
        - cx: v[0], v[1]
        - cx: a[1], v[0]
      body:
        - cx: v[1], t[0]
"""
    )
    assert len(found.values) == 1
    assert found.values[0].size == 2


def test_phases_in_a_compute_part_forbid_measuring() -> None:
    text = SCOPE.replace("      body:", "        - t: v[1]\n      body:")
    found = graph(text)
    assert [v.is_plain for v in found.values] == [True, False]


@pytest.mark.parametrize(
    "step", ["- h: v[0]", "- cx: a[0], t[1]", "- ry: {angle: pi/8, on: v.0}"]
)
def test_what_cannot_be_moved_stays_as_it_is_written(step: str) -> None:
    text = SCOPE.replace("      body:", f"        {step}\n      body:")
    if "v[0]" in step or "v.0" in step:
        with pytest.raises(InputError):
            graph(text)
        return
    found = graph(text)
    assert found.values == ()
    assert len(found.uses) > 0


def test_nested_scopes_are_values_of_one_graph() -> None:
    found = graph(
        """\
  - scope:
      name: outer
      workspace: {w: 1}
      compute:
        - scope:
            name: inner
            workspace: {u: 1}
            compute:
              - and: {controls: [a.0, a.1], into: u.0}
            body:
              - and: {controls: [u.0, a.2], into: w.0}
      body:
        - cx: w[0], t[0]
"""
    )
    assert [v.inputs for v in found.values] == [(), (0,)]
    assert [u.needs for u in found.uses] == [(1,)]
    # The inner value is returned in the source, and computed again for the mirror.
    actions = [action for action, number in found.written if number == 0]
    assert actions == ["compute", "uncompute", "use", "compute", "uncompute"]


def test_workspace_that_is_back_in_0_is_spare() -> None:
    found = graph(
        """\
  - scope:
      workspace: {v: 2}
      compute:
        - and: {controls: [a.0, a.1], into: v.1}
        - cx: v[1], v[0]
        - mcx: {controls: [a.0, a.1], target: v.1}
      body:
        - cx: v[0], t[0]
"""
    )
    assert len(found.values) == 1
    assert found.values[0].size == 1


def test_a_dropped_value_is_measured_reset_and_fixed() -> None:
    program = read_program(HEAD + SCOPE, "values.yaml")
    moves = [
        Move("compute", 0),
        Move("compute", 1),
        Move("drop", 0),
        Move("use", 0),
        Move("compute", 0),
        Move("uncompute", 1),
        Move("uncompute", 0),
    ]
    planned = planned_program(program, moves, find_device("slate-16"))
    names = [
        (op.name, op.bit, op.condition)
        for op in planned.operations
        if op.bit or op.condition or op.kind == "reset"
    ]
    assert names == [
        ("measure", "record[0]", None),
        ("reset", None, None),
        ("z", None, "record[0]"),
    ]
    assert planned.bits == (("record", 1),)
    without = rewritten(program, values_of(program), moves, has_reset=False)
    waiting = [op.name for op in without.operations if op.condition]
    assert waiting == ["x", "z"]


ENTANGLED = """OPENQASM 2.0;
include "qelib1.inc";
qreg a[2];
// @placer.workspace init=zero ends=zero
qreg w[1];
h a;
ccx a[0],a[1],w[0];
reset w[0];
"""


def test_scratch_reset_while_it_may_be_entangled_is_refused_with_both_lines() -> None:
    with pytest.raises(InputError) as caught:
        read_program(ENTANGLED, "reset.qasm")
    text = str(caught.value)
    assert "reset.qasm:8" in text
    assert "what line 7 has written" in text
    # Undone first, the reset is harmless.
    good = ENTANGLED.replace("reset", "ccx a[0],a[1],w[0];\nreset")
    assert read_program(good, "good.qasm").operations


def test_scratch_that_does_not_come_back_gets_a_counterexample() -> None:
    text = ENTANGLED.replace("reset w[0];\n", "")
    with pytest.raises(InputError, match=r"w\[0\] ends in 1"):
        read_program(text, "flat.qasm")


def test_a_value_read_after_its_cleanup_is_out_of_sight() -> None:
    with pytest.raises(InputError, match="v"):
        graph(SCOPE + "  - cx: v[1], t[1]\n")


def test_a_body_that_writes_what_the_compute_part_read_is_refused_with_both_lines():
    text = SCOPE.replace("- cx: v[1], t[0]", "- cx: t[0], a[2]")
    with pytest.raises(InputError) as caught:
        graph(text)
    told = str(caught.value)
    assert "values.yaml:12" in told
    assert "line 10" in told


def test_scratch_used_again_while_it_holds_something_names_both_lines() -> None:
    text = """\
registers:
  a: {width: 3, start: unknown}
  w: {width: 1, workspace: true}
  t: {width: 1, start: zero}
steps:
  - mcx: {controls: [a.0, a.1], target: w.0}
  - scope:
      workspace: {v: 1}
      compute:
        - mcx: {controls: [a.1, a.2], target: v.0}
        - and: {controls: [a.0, a.2], into: v.0}
      body:
        - cx: v[0], t[0]
"""
    with pytest.raises(InputError) as caught:
        read_program(text, "again.yaml")
    told = str(caught.value)
    assert "again.yaml:11" in told
    assert "as line 10 has left it" in told
