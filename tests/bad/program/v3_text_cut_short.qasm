// expect: the text ends in the middle of a statement expect-line: 7
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
gate g a { x a;
