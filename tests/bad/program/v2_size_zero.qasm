// expect: the size of 'r' is 0 expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
qreg r[0];
