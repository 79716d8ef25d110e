import { describe, expect, test } from 'vitest';
import { emptyCircuit, type GateOperation, gate, unitaryGate } from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { areAlike, mirrored, symmetriesOf } from '../../src/reshape/placement-symmetry.ts';

const unitaryOf = (operations: readonly GateOperation[]): Float64Array =>
  circuitUnitary({ ...emptyCircuit(3), operations });
const ALL = [
  [0, 1],
  [0, 2],
  [1, 2],
] as const;
const LINE = [
  [0, 1],
  [1, 2],
] as const;
const draw = random(1, 'symmetry');
const locals = (): GateOperation[] => [0, 1, 2].map((w) => unitaryGate(haarUnitary(2, draw), [w]));

describe('symmetries of a target', () => {
  test('single-wire gates before and after change nothing', () => {
    const inner = unitaryGate(haarUnitary(8, draw), [0, 1, 2]);
    const u = unitaryOf([inner]);
    expect(areAlike(u, unitaryOf([...locals(), inner, ...locals()]), 3)).toBe(true);
    expect(areAlike(u, haarUnitary(8, draw), 3)).toBe(false);
  });

  test('a Toffoli is the same from every side, forwards and backwards', () => {
    const u = unitaryOf([gate('ccx', [0, 1, 2])]);
    expect(symmetriesOf(u, 3, ALL)).toHaveLength(11);
    expect(symmetriesOf(u, 3, LINE)).toHaveLength(3);
  });

  test('a Fredkin lets its targets change places', () => {
    const found = symmetriesOf(unitaryOf([...locals(), gate('cswap', [0, 1, 2]), ...locals()]), 3, ALL); // biome-ignore format: one call
    const names = found.map(({ order, isReversed }) => `${order.join('')}${isReversed ? ' reversed' : ''}`); // biome-ignore format: one list
    expect(names.sort()).toEqual(['012 reversed', '021', '021 reversed']);
  });

  test('a generic unitary has none, one that is symmetric as a matrix runs backwards', () => {
    const half = haarUnitary(8, draw);
    expect(symmetriesOf(half, 3, ALL)).toEqual([]);
    const transpose = half.map((_, at) => {
      const [base, k] = [at < 64 ? 0 : 64, at % 64];
      return half[base + (k % 8) * 8 + Math.floor(k / 8)]!;
    });
    const symmetric = unitaryOf([unitaryGate(half, [0, 1, 2]), unitaryGate(transpose, [0, 1, 2])]);
    expect(symmetriesOf(symmetric, 3, ALL)).toEqual([{ order: [0, 1, 2], isReversed: true }]);
  });

  test('placements are renumbered and turned', () => {
    const symmetry = { order: [2, 0, 1], isReversed: true };
    expect(mirrored([[0, 1], [1, 2], [0, 1]].map(([a, b]) => [a!, b!] as const), symmetry)).toEqual([
      [0, 2],
      [0, 1],
      [0, 2],
    ]); // biome-ignore format: a list of pairs
  });
});
