import { expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { writeCircuit } from '../../src/write/openqasm.ts';

const read = (body: string) =>
  readCircuit(
    `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[3] q; bit[3] c; h q[0]; h q[1]; c[0] = measure q[0]; ${body} c[2] = measure q[2];`,
    'river.qasm',
  ).circuit;

// the first needs a bit that keeps its condition, the second does not: they do the same
const first = read('if (c[0]) { c[0] = measure q[1]; x q[2]; }');
const second = read('if (c[0]) { x q[2]; c[0] = measure q[1]; }');
const other = read('if (c[0]) { c[0] = measure q[1]; z q[2]; }');

test('bits that only keep a condition are no outputs', () => {
  expect(compareCircuits(first, second, {}).verdict).toBe('same');
  expect(compareCircuits(second, first, {}).verdict).toBe('same');
  const again = readCircuit(writeCircuit(first), 'again.qasm').circuit;
  expect(compareCircuits(first, again, {}).verdict).toBe('same');
  expect(compareCircuits(first, other, {}).verdict).toBe('different');
  expect(compareCircuits(second, other, {}).verdict).toBe('different');
});
