// expect: 'n' is of type int, but its value is 2.5 expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
const int n = 2.5;
