// expect: the workspace wire w is the target of 'h' in line 8 expect-line: 7
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
@placer.workspace init=zero ends=zero
qubit w;
h w;
h w;
