// expect: version '4.0' of OpenQASM is not supported expect-line: 2
OPENQASM 4.0;
qreg q[1];
