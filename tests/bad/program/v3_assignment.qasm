// expect: assignments at run time are not supported expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
c[0] = 1;
