// expect: acts on 1 qubit and 2 controls, found 2 operands expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
ctrl(2) @ x q[0], q[1];
