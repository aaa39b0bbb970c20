// expect: gives 4 results, 'd' takes 2 expect-line: 7
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
creg c[4];
creg d[2];
measure q -> d;
