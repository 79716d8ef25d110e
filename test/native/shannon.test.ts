import { describe, expect, test } from 'vitest';
import {
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { goRound } from '../../src/native/links.ts';
import { multiplexedRotation } from '../../src/native/multiplexed.ts';
import { nativeSetOf } from '../../src/native/native-set.ts';
import { shannonCount, shannonGates } from '../../src/native/shannon.ts';
import { toNative } from '../../src/native/to-native.ts';
import { identity, kron } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

const set = nativeSetOf('cx,rz,sx');
const unitaryOf = (operations: readonly Operation[], wires: number): Float64Array =>
  circuitUnitary({ ...emptyCircuit(wires), operations });
const cxOf = (operations: readonly Operation[]): number =>
  operations.filter((o) => o.kind === 'gate' && o.wires.length > 1).length;

/** Largest difference of an entry once the phase is right. */
function gap(u: Float64Array, v: Float64Array): number {
  const { phase } = hilbertSchmidtDistance(u, v);
  const half = u.length / 2;
  const [c, s] = [Math.cos(phase), Math.sin(phase)];
  let worst = 0;
  for (let k = 0; k < half; k++) {
    const [re, im] = [c * u[k]! - s * u[half + k]!, c * u[half + k]! + s * u[k]!];
    worst = Math.max(worst, Math.hypot(v[k]! - re, v[half + k]! - im));
  }
  return worst;
}

describe('quantum Shannon decomposition', () => {
  test.each([2, 3, 4, 5, 6])('%i wires: exact to 1e-13 with the published count', (n) => {
    // Shende, Bullock, Markov, IEEE TCAD 25, 1000 (2006), table 1: 3, 20, 100, 444, 1868
    expect(shannonCount(n)).toBe([3, 20, 100, 444, 1868][n - 2]);
    const u = haarUnitary(2 ** n, random(n, 'shannon'));
    const native = toNative(shannonGates(u, n), n, set);
    expect(cxOf(native)).toBe(shannonCount(n));
    expect(gap(u, unitaryOf(native, n))).toBeLessThan(1e-13);
  });

  const draw = random(3, 'degenerate');
  const haar = (n: number): Float64Array => haarUnitary(2 ** n, draw);
  const diagonal = (n: number): Float64Array => {
    const d = 2 ** n;
    const out = new Float64Array(2 * d * d);
    for (let k = 0; k < d; k++) {
      const phase = 6 * draw();
      out[k * (d + 1)] = Math.cos(phase);
      out[d * d + k * (d + 1)] = Math.sin(phase);
    }
    return out;
  };
  const near = (u: Float64Array, n: number, size: number): Float64Array => {
    const turn = Array.from({ length: n - 1 }, (_, k) => gate('rxx', [k, k + 1], size * draw()));
    return unitaryOf(
      [
        unitaryGate(
          u,
          Array.from({ length: n }, (_, k) => k),
        ),
        ...turn,
      ],
      n,
    );
  };
  const cases: [string, number, Float64Array, number][] = [
    ['identity', 4, identity(16), 0],
    ['a product of single-wire gates', 3, kron(kron(haar(1), haar(1), 2, 2), haar(1), 4, 2), 0],
    ['a product of pairs', 4, kron(haar(2), haar(2), 4, 4), 6],
    ['a diagonal', 4, diagonal(4), 14],
    ['one CX', 4, unitaryOf([gate('cx', [2, 0])], 4), 1],
    ['a Toffoli', 3, unitaryOf([gate('ccx', [0, 2, 1])], 3), 12],
    ['a controlled unitary', 4, unitaryOf([{ ...unitaryGate(haar(3), [0, 1, 2, 3]), controls: [true] }], 4), 48], // biome-ignore format: one case a line
    [
      'pairs next to each other',
      5,
      unitaryOf([unitaryGate(haar(3), [0, 2, 4]), unitaryGate(haar(2), [3, 1])], 5),
      23,
    ],
    ['a reversal', 4, unitaryOf([gate('swap', [0, 3]), gate('swap', [1, 2])], 4), 6],
    ['nearly the identity, 1e-5', 4, near(identity(16), 4, 1e-5), 100],
    ['nearly the identity, 1e-9', 4, near(identity(16), 4, 1e-9), 100],
    ['nearly the identity, 1e-13', 4, near(identity(16), 4, 1e-13), 100],
    ['nearly a diagonal', 4, near(diagonal(4), 4, 1e-7), 100],
    ['nearly a product', 4, near(kron(haar(2), haar(2), 4, 4), 4, 1e-8), 100],
  ];
  test.each(cases)('%s on %i wires', (_, n, u, most) => {
    const native = toNative(shannonGates(u, n), n, set);
    // coordinates below 1e-9 count as zero where a pair is written, so nearly degenerate targets keep that much
    expect(gap(u, unitaryOf(native, n))).toBeLessThan(2e-9);
    expect(cxOf(native)).toBeLessThanOrEqual(most);
  });
});

test('a multiplexed rotation turns by the angle of its basis state', () => {
  for (const axis of ['y', 'z'] as const) {
    const angles = Float64Array.from([0.3, -1.2, 2.2, 0.3]);
    const { operations, open } = multiplexedRotation(axis, 1, [0, 2], angles);
    expect(open).toBe(2);
    const flip = axis === 'z' ? gate('cx', [0, 1]) : gate('cz', [0, 1]);
    const wanted: GateOperation[] = [...angles].map((angle, x) => ({
      ...gate(`r${axis}`, [0, 2, 1], angle),
      controls: [x >= 2, x % 2 === 1],
    }));
    expect(gap(unitaryOf(wanted, 3), unitaryOf([...operations, flip], 3))).toBeLessThan(1e-14);
  }
});

test('matrices on three wires and more, and controlled ones, are taken apart with their phase', () => {
  const draw = random(4, 'phase');
  const operations: GateOperation[] = [
    unitaryGate(haarUnitary(8, draw), [3, 0, 2]),
    { ...unitaryGate(haarUnitary(4, draw), [1, 2, 3]), controls: [false] },
    { ...unitaryGate(haarUnitary(2, draw), [3, 0, 1, 2]), controls: [true, true, true] },
  ];
  const native = toNative(operations, 4, set);
  expect(gap(unitaryOf(operations, 4), unitaryOf(native, 4))).toBeLessThan(1e-13);
});

test('three controls take 14 CX', () => {
  // Madden, Simonetto, ACM TQC 3(2) (2022)
  const operations = [gate('c3x', [0, 1, 2, 3])];
  const native = toNative(operations, 4, set);
  expect(cxOf(native)).toBe(14);
  expect(gap(unitaryOf(operations, 4), unitaryOf(native, 4))).toBeLessThan(1e-14);
});

test('gates between wires that are not linked go round', () => {
  const draw = random(5, 'links');
  const line = [
    [0, 1],
    [1, 2],
    [2, 3],
    [3, 4],
  ] as const;
  const cases: [GateOperation, number][] = [
    [gate('cx', [0, 2]), 4],
    [gate('cx', [4, 0]), 12],
    [gate('cz', [1, 4]), 8],
    [unitaryGate(haarUnitary(4, draw), [3, 0]), 5],
    [gate('cx', [2, 3]), 1],
  ];
  for (const [operation, count] of cases) {
    const found = goRound([operation], line, 5);
    expect(cxOf(found)).toBe(count);
    for (const { wires } of found) {
      if (wires.length === 2) expect(Math.abs(wires[0]! - wires[1]!)).toBe(1);
    }
    expect(gap(unitaryOf([operation], 5), unitaryOf(found, 5))).toBeLessThan(1e-14);
  }
});
