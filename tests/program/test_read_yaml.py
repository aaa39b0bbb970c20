"""Program YAML: operands, calls, scopes, repetition."""

from __future__ import annotations

import math
import re
import time
from pathlib import Path

import numpy as np
import pytest
from program_matrices import program_matrix, same_up_to_phase

import placer.program
from placer.errors import InputError
from placer.program.read import read_program


def read(
    steps, registers="{a: 4, b: 4, t: , w: {width: 2, workspace: true}}", **options
):
    indented = "\n".join(f"  {line}" for line in steps.strip("\n").split("\n"))
    text = f"registers: {registers}\nbits: {{c: 4, d: }}\nsteps:\n{indented}\n"
    return read_program(text, "p.yaml", **options)


def flat(program):
    result = []
    for op in program.operations:
        name = f"-{op.name}" if op.inverse else op.name
        text = " ".join([name, *(program.wire_names[w] for w in op.wires)])
        for value in op.params:
            text += f" {value:.6g}"
        result.append(text + (f" -> {op.bit}" if op.bit else ""))
    return result


def test_registers():
    program = read(
        "- x: t",
        "{a: {width: 2, start: zero, lendable: false}, b: 1, t: , u: {},"
        " w: {workspace: true}}",
    )
    shape = [
        (r.name, r.width, r.is_single, r.start, r.workspace, r.lendable)
        for r in program.registers
    ]
    assert shape == [
        ("a", 2, False, "zero", False, False),
        ("b", 1, False, "unknown", False, True),
        ("t", 1, True, "unknown", False, True),
        ("u", 1, True, "unknown", False, True),
        ("w", 1, True, "zero", True, True),
    ]
    assert program.bits == (("c", 4), ("d", 0))
    assert program.syntax == "yaml"
    assert program.name == "p"


def test_open_inputs():
    program = read(
        "- x: t", "{t: {start: zero}, w: {workspace: true}}", open_inputs=True
    )
    assert [r.start for r in program.registers] == ["unknown", "zero"]


@pytest.mark.parametrize(
    ("step", "expected"),
    [
        ("h: a[1:2]", ["h a[1]", "h a[2]"]),
        ("h: [a.3, t]", ["h a[3]", "h t"]),
        ("h: a[0], b.1:2", ["h a[0]", "h b[1]", "h b[2]"]),
        ("cx: a[0], b[1]", ["cx a[0] b[1]"]),
        ("cx: [a, b]", [f"cx a[{i}] b[{i}]" for i in range(4)]),
        ("cx: [t, b]", [f"cx t b[{i}]" for i in range(4)]),
        ("rz: {angle: -3*pi/8, on: t}", ["rz t -1.1781"]),
        ("rz: {angle: 0.25, on: t}", ["rz t 0.25"]),
        ("rz: {angle: 2**-1, on: t}", ["rz t 0.5"]),
        ("u: {angles: [1, pi, -1e-1], on: t}", ["u t 1 3.14159 -0.1"]),
        ("cp: {angle: tau/2, on: [t, a.0]}", ["cp t a[0] 3.14159"]),
        ("mcx: {controls: a.0, target: t}", ["cx a[0] t"]),
        ("mcx: {controls: [a.0:1, b.3], target: t}", ["mcx a[0] a[1] b[3] t"]),
        ("mcx: {controls: 'a[0], !t', target: b.0}", ["x t", "mcx a[0] t b[0]", "x t"]),
        (
            "mcx: {controls: [not a.0, t], target: b.0}",
            ["x a[0]", "mcx a[0] t b[0]", "x a[0]"],
        ),
        ("mcz: {on: [a.0:1, t]}", ["mcz a[0] a[1] t"]),
        ("mcz: {controls: a.0, target: t}", ["cz a[0] t"]),
        (
            "mcp: {angle: pi, controls: [a.0, a.1], target: t}",
            ["mcp a[0] a[1] t 3.14159"],
        ),
        ("mcp: {angle: 1, on: [a.0, t]}", ["cp a[0] t 1"]),
        ("measure: t", ["measure t"]),
        ("measure: {from: t, into: d}", ["measure t -> d"]),
        (
            "measure: {from: a.0:1, into: c.2:3}",
            ["measure a[0] -> c[2]", "measure a[1] -> c[3]"],
        ),
        (
            "measure: {from: [t, a.0], into: [d, c.1]}",
            ["measure t -> d", "measure a[0] -> c[1]"],
        ),
        ("barrier: [t, a.0]", ["barrier t a[0]"]),
        ("repeat: {times: 2, steps: [{x: t}, {h: t}]}", ["x t", "h t", "x t", "h t"]),
        ("repeat: {times: 0, steps: [{x: t}]}", []),
    ],
)
def test_step(step, expected):
    assert flat(read(f"- {step}")) == expected


def test_barrier_on_all():
    assert flat(read("- barrier: all", "{a: 2, t: }")) == ["barrier a[0] a[1] t"]


def test_first_reset_is_a_start_in_zero():
    program = read("- reset: a\n- x: a", "{a: 2}")
    assert program.registers[0].start == "zero"
    assert flat(program) == ["x a[0]", "x a[1]"]


SCOPE = """
- scope:
    name: carry
    workspace: {v: 2}
    compute:
      - and: {controls: [a.0, a.1], into: v.0}
      - s: b[0]
      - and: {controls: [v.0, not a.2], into: v.1}
      - rx: {angle: 0.5, on: b.1}
    body:
      - cx: v[1], t
"""


def test_scope():
    program = read(SCOPE)
    assert flat(program) == [
        "and a[0] a[1] carry_1.v[0]",
        "s b[0]",
        "x a[2]",
        "and carry_1.v[0] a[2] carry_1.v[1]",
        "x a[2]",
        "rx b[1] 0.5",
        "cx carry_1.v[1] t",
        "rx b[1] -0.5",
        "x a[2]",
        "-and carry_1.v[0] a[2] carry_1.v[1]",
        "x a[2]",
        "sdg b[0]",
        "-and a[0] a[1] carry_1.v[0]",
    ]
    assert [op.part for op in program.operations] == (
        ["compute"] * 6 + ["body"] + ["cleanup"] * 6
    )
    (scope,) = program.scopes
    assert (scope.compute, scope.body, scope.cleanup) == ((0, 6), (6, 7), (7, 13))
    assert (scope.number, scope.parent, scope.name) == (0, -1, "carry")
    register = program.registers[-1]
    assert (register.name, register.start, register.workspace) == (
        "carry_1.v",
        "zero",
        True,
    )


def test_repeated_scope_has_workspace_of_its_own():
    inner = "\n".join(f"    {line}" for line in SCOPE.strip().split("\n"))
    program = read(f"- repeat:\n    times: 2\n    steps:\n{inner}")
    names = [register.name for register in program.registers]
    assert names[-2:] == ["carry_1.v", "carry_2.v"]
    assert [scope.compute for scope in program.scopes] == [(0, 6), (13, 19)]


NESTED = """
- scope:
    workspace: {w2: 1}
    compute:
      - scope:
          workspace: {v: 1}
          compute:
            - and: {controls: [a.0, a.1], into: v}
            - t: a[3]
          body:
            - mcx: {controls: [v, a.2], target: w2}
    body:
      - scope:
          workspace: {v: 1}
          compute: [{cx: "w2, v"}]
          body: [{cx: "v, t"}]
"""


def test_nested_scopes():
    program = read(NESTED, "{a: 4, t: }")
    assert flat(program) == [
        "and a[0] a[1] scope2.v[0]",
        "t a[3]",
        "mcx scope2.v[0] a[2] scope1.w2[0]",
        "tdg a[3]",
        "-and a[0] a[1] scope2.v[0]",
        "cx scope1.w2[0] scope3.v[0]",
        "cx scope3.v[0] t",
        "cx scope1.w2[0] scope3.v[0]",
        "and a[0] a[1] scope4.v[0]",
        "t a[3]",
        "mcx scope4.v[0] a[2] scope1.w2[0]",
        "tdg a[3]",
        "-and a[0] a[1] scope4.v[0]",
    ]
    spans = [(s.parent, s.compute, s.body, s.cleanup) for s in program.scopes]
    assert spans == [
        (-1, (0, 5), (5, 8), (8, 13)),
        (0, (0, 2), (2, 3), (3, 5)),
        (0, (5, 6), (6, 7), (7, 8)),
        (0, (8, 10), (10, 11), (11, 13)),
    ]
    for op in program.operations:
        scope = program.scopes[op.scope]
        first, end = getattr(scope, op.part)
        assert first <= op.index < end


def test_mirror_undoes_every_gate():
    """A scope with an empty body is the identity, whatever it computes."""
    steps = """
- scope:
    compute:
    - h: a
    - s: a[0]
    - t: a[1]
    - sx: a[0]
    - sxdg: a[1]
    - y: t
    - rx: {angle: 0.3, on: a}
    - ry: {angle: 0.4, on: t}
    - rz: {angle: 0.5, on: a}
    - p: {angle: 0.6, on: t}
    - u: {angles: [0.1, 0.7, -1.3], on: a}
    - cx: a
    - cy: a
    - cz: a
    - ch: a
    - swap: a
    - cp: {angle: 0.3, on: a}
    - crx: {angle: 0.4, on: a}
    - cry: {angle: 0.5, on: a}
    - crz: {angle: 0.6, on: a}
    - rzz: {angle: 0.7, on: a}
    - rxx: {angle: 0.8, on: a}
    - mcx: {controls: a, target: t}
    - mcz: {on: [a, not t]}
    - mcp: {angle: 0.9, on: [a, t]}
    - barrier: a
    body: []
"""
    steps = re.sub(r"(c[xyzh]|swap): a\n", r"\1: a[0], a[1]\n", steps)
    steps = re.sub(r"on: a}", "on: 'a[0], a[1]'}", steps)
    program = read(steps, "{a: 2, t: }")
    assert len(program.operations) > 50
    assert same_up_to_phase(program_matrix(program), np.eye(8))


def test_negative_control_in_the_body_changes_nothing():
    steps = """
- scope:
    workspace: {v: 1}
    compute: [{and: {controls: [a.0, a.1], into: v}}]
    body: [{mcx: {controls: [v, not a.0], target: t}}]
"""
    assert "x a[0]" in flat(read(steps))


def test_and_into_workspace_of_the_file():
    steps = """
- scope:
    compute: [{and: {controls: [a.0, a.1], into: w.1}}]
    body: [{cx: 'w[1], t'}]
"""
    assert flat(read(steps))[-1] == "-and a[0] a[1] w[1]"


def test_inner_and_that_no_scope_takes_back():
    steps = """
- scope:
    workspace: {v: 1}
    compute: [{x: t}]
    body:
    - scope:
        compute: []
        body: [{and: {controls: [a.0, a.1], into: v}}]
"""
    with pytest.raises(InputError, match="nothing takes it back"):
        read(steps)


def test_all_faults_in_one_pass():
    with pytest.raises(InputError) as caught:
        read("- h: q\n- xx: a\n- rz: {angle: x, on: a}\n- cx: a\n- mcx: {controls: a}")
    assert [fault.place.line for fault in caught.value.faults] == [4, 5, 6, 7, 8]


@pytest.mark.parametrize(
    "steps",
    [
        "- repeat: {times: 1000000, steps: [{h: a}]}",
        "- repeat: {times: 1000000, steps: [{repeat: {times: 1000000, steps: []}}]}",
    ],
)
def test_runaway_repetition_is_refused(steps):
    with pytest.raises(InputError, match="expands to more than 1000000 steps"):
        read(steps)


def test_the_description_of_the_format_runs():
    text = Path(placer.program.__file__).with_name("program-yaml.md").read_text()
    match = re.search(r"```yaml\n(.*?)```", text, re.DOTALL)
    assert match is not None
    program = read_program(match[1], "example.yaml")
    assert program.name == "marked-sum"
    assert math.isclose(program.operations[9].params[0], math.pi / 4)


def test_scope_with_an_empty_compute_part():
    program = read("- h: t\n- scope: {compute: [], body: [{x: t}]}\n- h: t")
    (scope,) = program.scopes
    assert (scope.compute, scope.body, scope.cleanup) == ((1, 1), (1, 2), (2, 2))


def test_many_scopes_read_quickly():
    inner = "\n".join(f"    {line}" for line in SCOPE.strip().split("\n"))
    start = time.process_time()
    program = read(f"- repeat:\n    times: 7000\n    steps:\n{inner}")
    assert len(program.operations) == 91_000
    # 5 s is the promise; twice that leaves room for a slow machine.
    assert time.process_time() - start < 10
