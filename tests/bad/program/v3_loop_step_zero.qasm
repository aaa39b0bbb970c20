// expect: the step of a range is 0 expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
for int i in [0:0:3] { x q[0]; }
