// expect: the physical qubit '$0' cannot stand in a gate body expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
gate g a { cx a, $0; }
