// expect: the gate 'mine' is declared already, in line 6 expect-line: 7
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
gate mine a { h a; }
gate mine a { x a; }
