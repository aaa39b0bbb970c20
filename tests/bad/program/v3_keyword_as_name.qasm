// expect: 'in' is a word of the language expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
qubit[3] in;
