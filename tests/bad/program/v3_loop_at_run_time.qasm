// expect: a loop over a value is not supported expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
for int i in c { x q[0]; }
