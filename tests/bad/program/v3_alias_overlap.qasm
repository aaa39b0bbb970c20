// expect: the alias 'b' holds a qubit twice expect-line: 6
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] q;
bit[4] c;
let b = q[0:1] ++ q[1:2];
