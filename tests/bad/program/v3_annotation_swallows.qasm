// expect: '@placer.keep' does not take 'qubit' expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
@placer.keep qubit w;
qubit v;
