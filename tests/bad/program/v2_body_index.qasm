// expect: the argument 'a' of a gate takes no index expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
gate g a { x a[0]; }
