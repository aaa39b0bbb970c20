// expect: '@placer.keep' belongs on a declaration of qubits expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
@placer.keep
x q[0];
