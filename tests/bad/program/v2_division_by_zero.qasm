// expect: '/' has no value for 1, 0 expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
rz(1/0) q[0];
