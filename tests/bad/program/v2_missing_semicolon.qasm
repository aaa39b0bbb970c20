// expect: expected ';' after the call of 'x', found 'h' expect-line: 7
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
x q[0]
h q[0];
