import { expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import type { Circuit } from '../../src/circuit/circuit.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const read = (...lines: string[]): Circuit =>
  readCircuit(['OPENQASM 3;', 'include "stdgates.inc";', ...lines].join('\n'), 'x.qasm').circuit;

const original = read('qubit[2] a;', 'qubit b;', 'h a[0];', 'cx a[0], b;', 'rx(0.3) a[1];');
const other = read('qubit r;', 'qubit[2] q;', 'rx(0.3) q[0];', 'h q[1];', 'cx q[1], r;');

test('registers by name, and elements one by one', () => {
  expect(compareCircuits(original, other).verdict).toBe('different');
  for (const map of ['a[0]=q[1],a[1]=q[0],b=r', 'b=r, a[0] = q[1]', 'a[1]=q[0],b=r']) {
    const report = compareCircuits(original, other, { map });
    expect(report.verdict).toBe('same');
    expect(report.notes).toContain(`matched as asked: ${map}`);
  }
  expect(compareCircuits(original, other, { map: 'a=q,b=r' }).verdict).toBe('different');
});

test('bits in another order and of other names', () => {
  const a = read('qubit[2] q;', 'bit[2] c;', 'x q[0];', 'c = measure q;');
  const b = read('qubit[2] q;', 'bit[2] d;', 'x q[0];', 'd[1] = measure q[0];', 'd[0] = measure q[1];'); // biome-ignore format: one circuit
  expect(compareCircuits(a, b).verdict).toBe('different');
  expect(compareCircuits(a, b, { map: 'c[0]=d[1],c[1]=d[0]' }).verdict).toBe('same');
  expect(compareCircuits(a, b, { map: 'c[0]=d[1]' }).verdict).toBe('same');
  const wires = read('qubit[2] q;', 'bit[2] c;', 'x q[1];', 'c[1] = measure q[0];', 'c[0] = measure q[1];'); // biome-ignore format: one circuit
  expect(compareCircuits(a, wires, { map: 'q[0]=q[1]' }).verdict).toBe('same');
});

test.each([
  ['a', 'expected NAME=NAME'],
  ['a=q=r', 'expected NAME=NAME'],
  ['z=q', 'unknown register z of x.qasm'],
  ['a=r', 'expected registers of one size, got a with 2 and r with 1'],
  ['a[2]=q[0]', 'index out of range: a[2] of x.qasm has 2 elements'],
  ['a[0]=q[0],a[0]=q[1]', 'named twice: a[0] of the original'],
  ['a[0]=q[0],a[1]=q[0]', 'named twice: q[0] of the rewritten circuit'],
])('%s is refused', (map, message) => {
  expect(() => compareCircuits(original, other, { map })).toThrow(message);
});
