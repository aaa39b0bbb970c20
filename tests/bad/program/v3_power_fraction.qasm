// expect: pow(0.5) is not supported expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
pow(0.5) @ x q[0];
