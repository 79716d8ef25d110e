import { expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { narrowByStructure } from '../../src/plan/structure.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { writeCircuit } from '../../src/write/openqasm.ts';

const read = (body: string) =>
  readCircuit(`OPENQASM 3.0;\ninclude "stdgates.inc";\n${body}`, 'moved.qasm').circuit;

test.each([
  'qubit[2] q; bit c; ry(1.1) q[0]; c = measure q[0]; swap q[0], q[1];',
  'qubit[2] q; bit[2] c; ry(1.1) q[0]; ry(0.3) q[1]; c = measure q; swap q[0], q[1];',
  'qubit[3] q; bit c; ry(1.1) q[0]; cx q[0], q[1]; c = measure q[1]; swap q[1], q[2]; swap q[0], q[1];',
  'qubit[2] q; bit c; ry(1.1) q[0]; c = measure q[0]; swap q[0], q[1]; swap q[0], q[1];',
])('a measured qubit that a swap moves keeps its bit, and is an output beside it: %s', (body) => {
  for (const inputs of ['zero', 'any'] as const) {
    const rules = { inputs, outputs: 'measured' } as const;
    const circuit = read(body);
    const narrowed = narrowByStructure(circuit, contractOf(circuit, rules), {});
    const again = readCircuit(writeCircuit(narrowed.circuit), 'again.qasm').circuit;
    expect(compareCircuits(circuit, again, { contract: rules }).verdict).toBe('same');
  }
});
