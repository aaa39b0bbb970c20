// expect: 'sqrt' has no value for -1 expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
rz(sqrt(-1)) q[0];
