// expect: acts on 2 qubits, found 1 operand expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
cx q[0];
