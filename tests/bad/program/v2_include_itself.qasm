// expect: includes itself expect-line: 3
OPENQASM 2.0;
include "v2_include_itself.qasm";
qreg q[1];
