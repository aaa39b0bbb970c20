"""The replay reader must be able to fail: every planted error is found."""

from __future__ import annotations

import pytest

from tests.replay_reader import UnreadableError, read, same_function

SOURCE = """OPENQASM 3.0;
include "stdgates.inc";
qubit[3] a;
qubit t;
@placer.lendable
qubit m;
bit[2] r;
ctrl(3) @ x a[0], a[1], a[2], t;
cz a[0], m;
ctrl(3) @ x t, a[1], a[2], m;
r[0] = measure t;
r[1] = measure m;
"""

GOOD = """OPENQASM 3.0;
include "stdgates.inc";
pragma placer.format 1
pragma placer.layout a[0]=$0 a[1]=$1 a[2]=$2 t=$3 m=$4
bit[2] r;
bit[2] cleanup;
reset $5;
ccx $0, $1, $5;
ccx $5, $2, $3;
h $5;
cleanup[0] = measure $5;
if (cleanup[0] == 1) { cz $0, $1; x $5; }
cz $0, $4;
@placer.borrow lender=a[0]
ccx $0, $2, $4;
ccx $3, $1, $0;
ccx $0, $2, $4;
@placer.return lender=a[0]
ccx $3, $1, $0;
r[0] = measure $3;
r[1] = measure $4;
"""

PLANTED = {
    "phase fix left out": ("cz $0, $1; x $5", "x $5"),
    "phase fix on the wrong wire": ("cz $0, $1; x $5", "cz $0, $2; x $5"),
    "slot not set back": ("cz $0, $1; x $5", "cz $0, $1"),
    "fix never happens": ("cleanup[0] == 1", "cleanup[1] == 1"),
    "slot not prepared": ("reset $5;", ""),
    "input wiped at the top": ("reset $5;", "reset $5;\nreset $4;"),
    "scratch wiped in use": ("cz $0, $4;", "reset $0;\ncz $0, $4;"),
    "wires swapped": ("a[1]=$1 a[2]=$2 t=$3", "a[1]=$1 a[2]=$3 t=$2"),
    "two wires on a site": ("t=$3", "t=$4"),
    "wire not placed": (" t=$3", ""),
    "one gate lost": ("ccx $5, $2, $3;\n", ""),
    "one gate twice": ("cz $0, $4;", "cz $0, $4;\ncz $0, $4;"),
    "lender not given back": ("@placer.return lender=a[0]\nccx $3, $1, $0;\n", ""),
    "phase on an input": ("cz $0, $4;", "cz $0, $4;\nt $2;"),
    "idle site touched": ("cz $0, $4;", "cz $0, $4;\nx $9;"),
    "idle site entangled": ("cz $0, $4;", "cz $0, $4;\ncx $0, $9;"),
    "outcomes exchanged": ("r[1] = measure $4", "r[1] = measure $3"),
    "outcome missing": ("r[1] = measure $4;\n", ""),
    "a swap left in": ("cz $0, $4;", "cz $0, $4;\nswap $1, $2;"),
    "bit not declared": ("bit[2] r;", "bit[2] s;\npragma placer.renamed q=s"),
}


@pytest.mark.parametrize("seed", range(3))
def test_good_text_passes(seed):
    assert same_function(SOURCE, GOOD, samples=10, seed=seed) == []


@pytest.mark.parametrize("name", PLANTED)
def test_planted_error_is_found(name):
    old, new = PLANTED[name]
    assert GOOD.count(old) == 1
    try:
        found = same_function(SOURCE, GOOD.replace(old, new), samples=10)
    except UnreadableError as error:
        found = [str(error)]
    assert found, name


def test_openqasm2_with_definitions_ladders_and_conditions():
    source = """OPENQASM 2.0;
    include "qelib1.inc";
    gate maj(angle) a, b, c { cx c, b; ccx a, b, c; u1(-angle/2) c; }
    qreg q[3]; creg c[2];
    h q[0]; h q[2]; maj(pi/4) q[0], q[1], q[2];
    measure q[0] -> c[0];
    if(c==1) x q[1];
    """
    placed = """OPENQASM 3.0;
    pragma placer.layout q[0]=$8 q[1]=$3 q[2]=$2
    bit[2] c;
    reset $8; reset $3; reset $2;
    h $8; h $2;
    cx $2, $3; ctrl(2) @ x $8, $3, $2; p(-0.39269908169872414) $2;
    c[0] = measure $8;
    if (c[0] == 1) { x $3; }
    """
    assert same_function(source, placed) == []
    assert same_function(source, placed.replace("p(-", "p("))
    assert same_function(source, placed.replace("== 1", "== 0"))
    assert same_function(source, placed.replace("reset $8;", ""))


def test_modifiers():
    source = "OPENQASM 3; qubit[4] q; negctrl @ ctrl(2) @ x q[0], q[1], q[2], q[3];"
    placed = (
        "OPENQASM 3; pragma placer.layout q[0]=$0 q[1]=$1 q[2]=$2 q[3]=$3\n"
        "x $0; ctrl(3) @ x $0, $1, $2, $3; x $0;"
    ).replace("OPENQASM 3; ", "OPENQASM 3;\n")
    assert same_function(source, placed) == []
    assert same_function(source, placed.removesuffix("x $0;"))
    inverse = "OPENQASM 3; gate g a, b { t a; cx a, b; s b; } qubit[2] q; g q[0], q[1];"
    undone = inverse + " inv @ g q[0], q[1];"
    nothing = "OPENQASM 3;\npragma placer.layout q[0]=$0 q[1]=$1\nid $0; id $1;"
    assert same_function(undone, nothing) == []
    assert same_function(inverse, nothing)


@pytest.mark.parametrize(
    "text",
    [
        "qubit[2] q; foo q[0];",
        "qubit[2] q; x q[2];",
        "qubit[2] q; cx q[0], q[0];",
        "qubit[2] q; pow(2) @ x q[0];",
        "qubit q; x r;",
        "qubit q; x q",
        "qubit q; rz(__import__('os')) q;",
    ],
)
def test_what_it_cannot_read_it_refuses(text):
    with pytest.raises(UnreadableError):
        same_function(text, "pragma placer.layout q=$0 q[0]=$0 q[1]=$1\nid $0;")


def test_reading_keeps_layout_and_names():
    text = read(GOOD)
    assert text.layout["a[2]"] == 2
    assert text.bits == {"r": 2, "cleanup": 2}
    assert read(SOURCE).wires == ["a[0]", "a[1]", "a[2]", "t", "m"]
