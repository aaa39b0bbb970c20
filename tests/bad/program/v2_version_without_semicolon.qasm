// expect: expected ';' after the version expect-line: 3
OPENQASM 2.0
qreg q[1];
