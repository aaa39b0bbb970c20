// expect: but with q = 0b0011 the wire w ends in 1 expect-line: 7
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
@placer.workspace init=zero ends=zero
qubit w;
ccx q[0], q[1], w;
