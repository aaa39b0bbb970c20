// expect: 'n' does not fit its type uint expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
const uint n = -1;
