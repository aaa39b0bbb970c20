// expect: 'sine' is no function of constants expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
rz(sine(1)) q[0];
