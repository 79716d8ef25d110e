import { describe, expect, test } from 'vitest';
import { emptyCircuit, type GateOperation, gate } from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { permutationGates } from '../../src/native/permutation.ts';
import { monomialOf } from '../../src/native/structure.ts';
import { random } from '../../src/numeric/random.ts';

function shuffled(size: number, seed: number): Int32Array {
  const draw = random(seed, 'shuffled', size);
  const out = Int32Array.from({ length: size }, (_, k) => k);
  for (let k = size - 1; k > 0; k--) {
    const other = Math.floor(draw() * (k + 1));
    [out[k], out[other]] = [out[other]!, out[k]!];
  }
  return out;
}

function mapOf(operations: readonly GateOperation[], wires: number): Int32Array {
  const u = circuitUnitary({ ...emptyCircuit(wires), operations });
  return monomialOf(u, wires)!.to;
}

describe('permutations', () => {
  test.each([1, 2, 3, 4, 5, 6])('random ones on %i wires are made exactly', (n) => {
    for (let seed = 0; seed < 6; seed++) {
      const to = shuffled(2 ** n, seed);
      expect(mapOf(permutationGates(to, n), n)).toEqual(to);
    }
  });

  test.each([3, 4, 5, 6])('CX circuits on %i wires take CX alone', (n) => {
    const draw = random(n, 'linear');
    const operations = Array.from({ length: 12 }, () => {
      const a = Math.floor(draw() * n);
      return gate('cx', [a, (a + 1 + Math.floor(draw() * (n - 1))) % n]);
    });
    const to = mapOf([...operations, gate('x', [1])], n);
    const gates = permutationGates(to, n);
    expect(mapOf(gates, n)).toEqual(to);
    expect(gates.every(({ name }) => name === 'cx' || name === 'x')).toBe(true);
    if (n <= 4) expect(gates.filter(({ name }) => name === 'cx').length).toBeLessThanOrEqual(12);
  });

  test.each([3, 4, 5, 6, 7])('a cyclic shift of %i wires takes 3(n - 1) CX', (n) => {
    // arXiv:2408.07898
    const to = Int32Array.from({ length: 2 ** n }, (_, x) => (x >> 1) + (x & 1) * 2 ** (n - 1));
    const gates = permutationGates(to, n);
    expect(mapOf(gates, n)).toEqual(to);
    expect(gates.map(({ name }) => name)).toEqual(new Array(3 * (n - 1)).fill('cx'));
  });

  test('counting up by one takes one NOT a wire', () => {
    for (const n of [3, 4, 5]) {
      const d = 2 ** n;
      const to = Int32Array.from({ length: d }, (_, x) => (x + 1) % d);
      const gates = permutationGates(to, n);
      expect(mapOf(gates, n)).toEqual(to);
      expect(gates).toHaveLength(n);
    }
  });
});
