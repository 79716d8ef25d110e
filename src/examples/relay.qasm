OPENQASM 3;
include "stdgates.inc";
// A relay of three stations, as first written.
qubit[3] station;
h station[0];
cx station[0], station[1];
t station[1];
cx station[0], station[1];
ccx station[0], station[1], station[2];
