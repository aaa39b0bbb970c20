// expect: 'b' is no argument of gate 'g' expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
gate g a { cx a,b; }
