OPENQASM 3;
include "stdgates.inc";
// The tide along the valley: a Fourier transform of four stations, read at the end.
qubit[4] station;
bit[4] tide;
h station[0];
cp(pi/2) station[1], station[0];
cp(pi/4) station[2], station[0];
cp(pi/8) station[3], station[0];
h station[1];
cp(pi/2) station[2], station[1];
cp(pi/4) station[3], station[1];
h station[2];
cp(pi/2) station[3], station[2];
h station[3];
tide[3] = measure station[0];
tide[2] = measure station[1];
tide[1] = measure station[2];
tide[0] = measure station[3];
