// expect: 'h' is unexpected expect-line: 7
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
x q[0]
h q[0];
