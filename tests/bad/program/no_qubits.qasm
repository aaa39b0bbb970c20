// expect: declares no qubits expect-line: 0
OPENQASM 3.0;
bit c;
