// expect: the file 'nowhere.inc' cannot be read expect-line: 3
OPENQASM 2.0;
include "nowhere.inc";
qreg q[1];
