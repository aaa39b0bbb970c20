// expect: 'q' has 4 qubits, 'r' has 3 expect-line: 7
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
qreg r[3];
cx q,r;
