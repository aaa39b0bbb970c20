// expect: the version must be the first statement expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
OPENQASM 2.0;
