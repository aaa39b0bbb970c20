// expect: the workspace declared in line 7 must end in |0>, but along one branch of 'h' in line 8 the wire w[0] ends in 1 expect-line: 7
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
// @placer.workspace init=zero ends=zero
qreg w[1];
h q;
ccx q[0],q[1],w[0];
