// expect: acts on 1 qubit, found 2 operands expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
h q[0],q[1];
