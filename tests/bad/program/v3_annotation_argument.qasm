// expect: '@placer.workspace' lacks ends=zero expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
@placer.workspace init=zero
qubit w;
