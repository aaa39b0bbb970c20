// expect: 'r' is not declared expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
x r[0];
