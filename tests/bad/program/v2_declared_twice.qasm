// expect: 'q' is declared already, as a quantum register in line 4 expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
qreg q[2];
