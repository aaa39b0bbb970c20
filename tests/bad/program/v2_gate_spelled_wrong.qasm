// expect: did you mean 'cswap'? expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
cswp q[0],q[1],q[2];
