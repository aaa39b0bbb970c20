// expect: must stand alone on its line expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
qreg w[1]; // @placer.workspace init=zero ends=zero
