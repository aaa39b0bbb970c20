// expect: is a quantum register, expected a classical register expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
measure q[0] -> q[1];
