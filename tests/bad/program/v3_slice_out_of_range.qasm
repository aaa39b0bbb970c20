// expect: q[4] does not exist expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
x q[1:4];
