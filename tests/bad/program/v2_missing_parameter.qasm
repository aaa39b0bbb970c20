// expect: takes 1 parameter, found 0 expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
rz q[0];
