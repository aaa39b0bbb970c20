OPENQASM 3.0;
include "stdgates.inc";
// Invented scenario: a deep channel is kept free by conditions along one line.
// On sites that offer a third level, long chains of controls need no workspace.
qubit[7] mark;
qubit buoy;
h mark;
ctrl(7) @ x mark[0], mark[1], mark[2], mark[3], mark[4], mark[5], mark[6], buoy;
ctrl(4) @ x mark[0], mark[1], mark[2], mark[3], buoy;
ctrl(6) @ z mark[0], mark[1], mark[2], mark[3], mark[4], mark[5], mark[6];
