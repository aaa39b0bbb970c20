// expect: declare one register in a statement expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
qubit a, b;
