// expect: ctrl(0) needs a count of at least 1 expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
ctrl(0) @ x q[0];
