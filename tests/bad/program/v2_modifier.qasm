// expect: OpenQASM 2 has no gate modifiers expect-line: 6
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
ctrl @ x q[0],q[1];
