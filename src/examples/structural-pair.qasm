OPENQASM 3;
include "stdgates.inc";
// Five stations send their parity down the valley to one gauge; each is read as soon as it has spoken.
qubit[5] station;
qubit gauge;
bit[5] reading;
bit parity;
h station;
cx station[0], gauge;
cx station[1], gauge;
cx station[2], gauge;
cx station[3], gauge;
cx station[4], gauge;
h station;
reading = measure station;
parity = measure gauge;
