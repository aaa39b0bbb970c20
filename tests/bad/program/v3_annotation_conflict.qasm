// expect: contradict each other expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
@placer.keep
@placer.lendable
qubit w;
