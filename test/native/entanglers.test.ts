import { describe, expect, test } from 'vitest';
import {
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { gateTable } from '../../src/circuit/gates.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { canonical, canonicalGate } from '../../src/native/canonical.ts';
import { usesAtLeast } from '../../src/native/fitted-pair.ts';
import { nativeSetOf } from '../../src/native/native-set.ts';
import { toNative } from '../../src/native/to-native.ts';
import { anglesEach, entanglerUse, twoWireGates } from '../../src/native/two-wire.ts';
import { kron, mul } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

const QUARTER = Math.PI / 4;
const table = (name: string, ...angles: number[]): Float64Array =>
  gateTable.get(name)!.matrix(angles);
const unitaryOf = (operations: readonly Operation[], wires: number): Float64Array =>
  circuitUnitary({ ...emptyCircuit(wires), operations });
const distance = (u: Float64Array, v: Float64Array): number =>
  hilbertSchmidtDistance(u, v).distance;
const usesIn = (gates: readonly GateOperation[]): number =>
  gates.filter(({ wires }) => wires.length === 2).length;

const draw = random(1, 'entanglers');
const dressed = (u: Float64Array): Float64Array => {
  const local = (): Float64Array => kron(haarUnitary(2, draw), haarUnitary(2, draw), 2, 2);
  return mul(local(), mul(u, local(), 4), 4);
};

describe('fewest uses', () => {
  // Huang et al., PRL 130, 070601 (2023) for sqrt(iSWAP); Zhang, Vala, Sastry, Whaley, PRL 93, 020502 (2004) for B;
  // iSWAP is CZ and a swap, so that two make (c1, c2, 0) and three everything, as for CX
  test.each([
    ['sqrtiswap', 'id', 0],
    ['sqrtiswap', 'sqrtiswap', 1],
    ['sqrtiswap', 'cx', 2],
    ['sqrtiswap', 'iswap', 2],
    ['sqrtiswap', 'b', 2],
    ['sqrtiswap', 'swap', 3],
    ['iswap', 'iswap', 1],
    ['iswap', 'cx', 2],
    ['iswap', 'sqrtiswap', 2],
    ['iswap', 'b', 2],
    ['iswap', 'swap', 3],
    ['b', 'b', 1],
    ['b', 'cx', 2],
    ['b', 'iswap', 2],
    ['b', 'swap', 2],
    ['b', 'sqrtiswap', 2],
  ])('%s makes %s in %i', (entangler, name, count) => {
    const u = name === 'id' ? canonicalGate([0, 0, 0]) : table(name);
    const use = entanglerUse({ name: entangler });
    for (const wanted of [u, dressed(u)]) {
      const gates = twoWireGates(wanted, use)!;
      expect(usesIn(gates)).toBe(count);
      expect(distance(wanted, unitaryOf(gates, 2))).toBeLessThan(1e-20);
    }
  });

  test.each(['sqrtiswap', 'iswap', 'b'])(
    '%s makes random gates in as few as the region says',
    (name) => {
      const use = entanglerUse({ name });
      const counts = [0, 0, 0, 0];
      for (let k = 0; k < 40; k++) {
        const u = haarUnitary(4, draw);
        const gates = twoWireGates(u, use)!;
        const [c1, c2, c3] = canonical(u).c;
        const region = name === 'sqrtiswap' ? (Math.abs(c3) <= c1 - c2 ? 2 : 3) : name === 'b' ? 2 : 3; // biome-ignore format: one choice
        expect(usesIn(gates)).toBe(region);
        counts[region]!++;
        expect(distance(u, unitaryOf(gates, 2))).toBeLessThan(1e-20);
      }
      if (name === 'sqrtiswap') expect(counts[2]).toBeGreaterThan(counts[3]!);
    },
  );

  test('on the wall between two and three uses of sqrt(iSWAP)', () => {
    const use = entanglerUse({ name: 'sqrtiswap' });
    for (const [c1, c2] of [
      [0.7, 0.4],
      [0.6, 0.3],
      [QUARTER, QUARTER / 2],
      [0.5, 0.3],
    ] as const) {
      const u = dressed(canonicalGate([c1, c2, c1 - c2]));
      const gates = twoWireGates(u, use)!;
      expect(usesIn(gates)).toBe(2);
      expect(distance(u, unitaryOf(gates, 2))).toBeLessThan(1e-20);
    }
  });

  test('the share of two uses of sqrt(iSWAP) is 79 percent', () => {
    // Huang et al.: about 79 % of the Haar measure; 2000 draws have a standard deviation of 0.9 %
    const total = 2000;
    let two = 0;
    for (let k = 0; k < total; k++) {
      const { c } = canonical(haarUnitary(4, draw));
      if (usesAtLeast(c, { name: 'sqrtiswap' }) === 2) two++;
    }
    expect(Math.abs(two / total - 0.794)).toBeLessThan(0.03);
  });
});

describe('entanglers of the caller', () => {
  test('any class will do, in a few uses', () => {
    for (const c of [
      [0.5, 0.2, 0.1],
      [0.3, 0, 0],
      [QUARTER, QUARTER, 0.3],
    ] as const) {
      const entangler = { name: 'own', matrix: dressed(canonicalGate(c)) };
      const use = entanglerUse(entangler);
      for (const u of [table('cx'), haarUnitary(4, draw)]) {
        const gates = twoWireGates(u, use)!;
        expect(distance(u, unitaryOf(gates, 2))).toBeLessThan(1e-20);
        expect(gates.every((o) => o.wires.length === 1 || o.label === 'own')).toBe(true);
      }
    }
  });

  test('what does not entangle is refused', () => {
    const set = nativeSetOf('own,rz,sx', [{ name: 'own', matrix: table('swap') }]);
    expect(() => toNative([gate('cx', [0, 1])], 2, set)).toThrow(
      'expected an entangler that makes',
    );
  });

  test.each(['iswap,rz,sx', 'sqrtiswap,u3', 'b,rz,sx'])('circuits in %s', (list) => {
    const set = nativeSetOf(list);
    const operations = [
      gate('h', [0]),
      gate('ccx', [0, 1, 2]),
      unitaryGate(haarUnitary(4, draw), [2, 0]),
      gate('cp', [1, 2], 0.4),
    ];
    const native = toNative(operations, 3, set);
    for (const o of native) expect(list.split(',')).toContain((o as GateOperation).name);
    expect(distance(unitaryOf(operations, 3), unitaryOf(native, 3))).toBeLessThan(1e-18);
  });
});

test('open angles that each use brings', () => {
  // CX lets one rotation pass on each wire, sqrt(iSWAP) only the sum of two, B none
  const each = (name: string): number => anglesEach({ name });
  expect(['cx', 'cz', 'ecr', 'iswap', 'sqrtiswap', 'b', 'swap'].map(each)).toEqual([4, 4, 4, 4, 5, 6, 0]); // biome-ignore format: one row
  expect(anglesEach({ name: 'rzz', angle: 'free' })).toBe(5);
});
