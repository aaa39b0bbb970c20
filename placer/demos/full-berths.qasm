OPENQASM 3.0;
include "stdgates.inc";
// Invented scenario: every berth of a small harbour is taken, so no site of a
// ten-site device is free: workspace must be borrowed from berths that idle.
qubit[5] berth;
qubit pilot;
qubit[4] cargo;
h berth;
ctrl(4) @ x berth[0], berth[1], berth[2], berth[3], pilot;
cx pilot, cargo[0];
ctrl(4) @ x berth[1], berth[2], berth[3], berth[4], pilot;
cx cargo[1], cargo[2];
ctrl(5) @ x berth[0], berth[1], berth[2], berth[3], berth[4], pilot;
