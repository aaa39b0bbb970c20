// expect: more than 1000000 members expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
for int i in [0:2000000] { x q[0]; }
