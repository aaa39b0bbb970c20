// expect: the same qubit twice: 'q[2]' expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
cx q,q[2];
