// expect: takes 0 parameters, found 1 expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
x(pi) q[0];
