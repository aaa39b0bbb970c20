// expect: must be 1 to 1000000 expect-line: 3
OPENQASM 2.0;
qreg q[2000000];
