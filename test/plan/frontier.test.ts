import { describe, expect, test } from 'vitest';
import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { countCircuit } from '../../src/circuit/counts.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { frontier } from '../../src/plan/frontier.ts';
import { narrowByStructure } from '../../src/plan/structure.ts';
import { narrowAlong, planStructure } from '../../src/plan/structure-plan.ts';
import { structuralRelation } from '../../src/survey/light-cones.ts';
import { planWidth } from '../../src/survey/width.ts';
import { cubic, type Edge, grid, path, ring } from '../survey/graphs.ts';

const of = (wires: number, operations: readonly Operation[], bits = 0): Circuit => ({
  ...emptyCircuit(wires, bits),
  operations,
});

/** k layers of generic gates on alternating neighbours of a line. */
function brickwork(n: number, k: number): Circuit {
  const draw = random('brickwork', n, k);
  const operations: GateOperation[] = [];
  for (let layer = 0; layer < k; layer++) {
    for (let a = layer % 2; a + 1 < n; a += 2) {
      operations.push(unitaryGate(haarUnitary(4, draw), [a, a + 1]));
    }
  }
  return of(n, operations);
}

/** One layer of ZZ rotations on the edges, mixing, measurement. */
function layer(n: number, edges: readonly Edge[], seed: number): Circuit {
  const draw = random('layer', seed);
  const operations: Operation[] = Array.from({ length: n }, (_, k) => gate('h', [k]));
  const shuffled = edges.map((edge) => ({ edge, at: draw() })).sort((a, b) => a.at - b.at);
  for (const { edge } of shuffled) operations.push(gate('rzz', edge, draw()));
  for (let k = 0; k < n; k++) operations.push(gate('rx', [k], 0.8));
  for (let k = 0; k < n; k++) operations.push({ kind: 'measure', wire: k, bit: k });
  return of(n, operations, n);
}

describe('brickwork of depth k on a line: width k + 1', () => {
  // From the left each layer widens a light cone by one wire to the right; the left partner of a last-layer
  // gate needs k wires beyond itself and its right partner k - 1, so k + 1 wires suffice. The exact planner
  // finds no less on lines long enough (n > k), and n wires are enough in any case.
  for (const k of [1, 2, 3, 4, 5, 6]) {
    test.each([k + 2, 13, 16])(`depth ${k} on %i wires`, (n) => {
      const plan = planWidth(structuralRelation(brickwork(n, k)));
      expect(plan.exact).toBe(true);
      expect(plan.width).toBe(Math.min(n, k + 1));
    });
  }
  test.each([2, 5])('depth %i on 60 wires', (k) => {
    const circuit = brickwork(60, k);
    expect(planStructure(circuit, contractOf(circuit)).width.width).toBe(k + 1);
  });
});

describe('commuting layers as circuits', () => {
  test.each([
    ['path', 24, path(24), 2],
    ['ring', 24, ring(24), 3],
    ['grid 3 x 7', 21, grid(3, 7), 4],
  ] as const)('%s', (_, n, edges, width) => {
    const circuit = layer(n, edges, 3);
    const narrowed = narrowByStructure(circuit, contractOf(circuit));
    expect(narrowed.circuit.wires).toBe(width);
    expect(narrowed.rules.some((rule) => rule.startsWith('commutation'))).toBe(true);
    const strict = narrowByStructure(circuit, contractOf(circuit), { rules: { commute: false } });
    expect(strict.circuit.wires).toBeGreaterThan(width);
    expect(strict.rules.some((rule) => rule.startsWith('commutation'))).toBe(false);
  });
  test('a cubic graph of 80 vertices on 16 wires or fewer, every gate still there', () => {
    const circuit = layer(80, cubic(80, 4), 4);
    const narrowed = narrowByStructure(circuit, contractOf(circuit));
    expect(narrowed.circuit.wires).toBeLessThanOrEqual(16);
    const counts = countCircuit(narrowed.circuit);
    expect(counts.twoQubit).toBe(120);
    expect(counts.resets).toBe(80);
    expect(narrowed.reuse.length).toBe(80 - narrowed.circuit.wires);
  });
});

describe('a circuit and its time reverse have equal widths (arXiv:2210.08039)', () => {
  test.each([1, 2, 3, 4, 5, 6, 7, 8, 9, 10])('seed %i', (seed) => {
    const draw = random('reverse', seed);
    const n = 5 + (seed % 6);
    const operations = Array.from({ length: n + 3 }, () => {
      const a = Math.floor(draw() * n);
      return unitaryGate(haarUnitary(4, draw), [a, (a + 1 + Math.floor(draw() * (n - 1))) % n]);
    });
    const width = planWidth(structuralRelation(of(n, operations)));
    const reverse = planWidth(structuralRelation(of(n, [...operations].reverse())));
    expect(reverse.width).toBe(width.width);
  });
});

describe('the frontier', () => {
  const star: Operation[] = [];
  for (let k = 1; k < 9; k++) {
    star.push(gate('ry', [k], 0.3 * k), gate('crx', [k, 0], 0.2 + k), gate('h', [k]));
  }
  for (let k = 0; k < 9; k++) star.push({ kind: 'measure', wire: k, bit: k });
  const circuit = of(9, star, 9);
  const plan = planStructure(circuit, contractOf(circuit));
  const points = frontier(plan);

  test('one point for each number of wires, never deeper with more', () => {
    expect(points.map(({ wires }) => wires)).toEqual([2, 3, 4, 5, 6, 7, 8, 9]);
    for (let k = 1; k < points.length; k++) {
      expect(points[k]!.depth).toBeLessThanOrEqual(points[k - 1]!.depth);
    }
    expect(points[0]!.depth).toBeGreaterThan(points.at(-1)!.depth);
  });
  test('any point of it can be taken', () => {
    for (const { wires, depth, order } of points) {
      const narrowed = narrowAlong(plan, order, wires);
      expect(narrowed.circuit.wires).toBeLessThanOrEqual(wires);
      expect(countCircuit(narrowed.circuit).depth).toBeLessThanOrEqual(depth);
      expect(
        narrowByStructure(circuit, contractOf(circuit), { wires }).circuit.wires,
      ).toBeLessThanOrEqual(wires);
    }
  });
  test('asking for fewer than can be gives the fewest', () => {
    expect(narrowByStructure(circuit, contractOf(circuit), { wires: 1 }).circuit.wires).toBe(2);
  });
  test('another score can be minimised; the same call gives the same plan', () => {
    const byResets = frontier(plan, { score: ({ operations }) => operations.length });
    expect(byResets.length).toBe(points.length);
    expect(frontier(plan)).toEqual(points);
  });
});

describe('large programs', () => {
  test('100 wires, 2,000 gates: width within 10 % of its lower bound, every gate kept', () => {
    const draw = random('large');
    const [n, count] = [100, 2000];
    const operations: Operation[] = [];
    for (let k = 0; k < count; k++) {
      const a = Math.min(n - 2, Math.floor((k / count) * n + draw() * 8));
      operations.push(draw() < 0.5 ? gate('crx', [a, a + 1], draw()) : gate('ry', [a], draw()));
    }
    const circuit = of(n, operations);
    const plan = planStructure(circuit, contractOf(circuit));
    expect(plan.width.width).toBeLessThanOrEqual(Math.ceil(1.1 * plan.width.lowerBound));
    const narrowed = narrowAlong(plan, plan.width.order, plan.width.width);
    expect(narrowed.circuit.wires).toBe(plan.width.width);
    const counts = countCircuit(narrowed.circuit);
    expect(counts.oneQubit + counts.twoQubit).toBe(count);
  });
  test('1,000 wires, 30,000 gates', () => {
    const draw = random('huge');
    const [n, count] = [1000, 30000];
    const operations: Operation[] = [];
    for (let k = 0; k < count; k++) {
      const a = Math.min(n - 2, Math.floor((k / count) * n + draw() * 8));
      operations.push(draw() < 0.5 ? gate('cx', [a, a + 1]) : gate('h', [a]));
    }
    const circuit = of(n, operations);
    const narrowed = narrowByStructure(circuit, contractOf(circuit));
    expect(narrowed.circuit.wires).toBeLessThan(20);
    expect(narrowed.reuse.length).toBe(n - narrowed.circuit.wires);
  });
});
