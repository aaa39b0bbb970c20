OPENQASM 3.0;
include "stdgates.inc";
// Invented scenario: a harbour opens its sluice when the right sensors agree.
// A search marks the sensor readings that open it.
qubit[5] sensor;
qubit sluice;
h sensor;
x sluice;
h sluice;
// Rule 1: all five sensors report high water.
ctrl(5) @ x sensor[0], sensor[1], sensor[2], sensor[3], sensor[4], sluice;
// Rule 2: the first three agree, whatever the others say.
ctrl(3) @ x sensor[0], sensor[1], sensor[2], sluice;
// Spread the marked readings.
h sensor;
x sensor;
ctrl(4) @ z sensor[0], sensor[1], sensor[2], sensor[3], sensor[4];
x sensor;
h sensor;
