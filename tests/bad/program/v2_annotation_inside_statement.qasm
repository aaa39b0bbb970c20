// expect: stands inside of a statement expect-line: 7
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
gate g a {
// @placer.keep
x a; }
qreg w[1];
