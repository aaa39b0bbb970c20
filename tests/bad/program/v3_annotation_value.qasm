// expect: '@placer.workspace' does not take 'init=one' expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
@placer.workspace init=one ends=zero
qubit w;
