// expect: add include "qelib1.inc" expect-line: 4
OPENQASM 2.0;
qreg q[2];
h q[0];
