// expect: unknown annotation '@placer.workspce' expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
// @placer.workspce init=zero ends=zero
qreg w[1];
