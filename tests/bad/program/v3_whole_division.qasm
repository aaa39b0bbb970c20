// expect: 1/2 divides whole numbers and leaves a rest expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
rz(1/2) q[0];
