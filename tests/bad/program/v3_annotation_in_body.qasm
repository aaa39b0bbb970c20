// expect: belongs on a declaration of qubits expect-line: 7
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
gate g a {
@placer.keep
x a;
}
