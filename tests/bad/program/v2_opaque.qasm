// expect: declare the gate or mark it as a black box expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
opaque magic a,b;
magic q[0],q[1];
