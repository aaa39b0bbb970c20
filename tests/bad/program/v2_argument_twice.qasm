// expect: 'a' stands twice among the arguments expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
gate g a,a { x a; }
