// expect: 'gate' is a word of the language expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
qreg gate[2];
