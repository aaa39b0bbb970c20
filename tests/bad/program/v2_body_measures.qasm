// expect: 'measure' cannot stand in the body of a gate expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
gate g a { measure a -> c; }
