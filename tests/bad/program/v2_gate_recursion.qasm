// expect: the gate 'loop' calls itself expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
gate loop a { x a; loop a; }
