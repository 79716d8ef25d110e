import { describe, expect, test } from 'vitest';
import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { bestAt } from '../../src/plan/frontier.ts';
import { planStructure } from '../../src/plan/structure-plan.ts';
import { planWindows, type Replacement, type Window, withWindows } from '../../src/plan/windows.ts';
import { factorChain } from '../../src/reshape/chain.ts';
import { influenceFloor, influenceTables } from '../../src/survey/influence.ts';
import { relationFromTable } from '../../src/survey/relation.ts';
import { planWidth } from '../../src/survey/width.ts';
import { outcomeGap, randomInputs, simulate } from './branch-simulation.ts';

/** cx cx cx cx = cx from a to c through b: with one more it is nothing at all, but ties a, b and c. */
function word(a: number, b: number, c: number): GateOperation[] {
  const pairs: [number, number][] = [
    [a, b],
    [b, c],
    [a, b],
    [b, c],
    [a, c],
  ];
  return pairs.map((pair) => gate('cx', pair));
}

const generic = (draw: () => number, a: number, b: number): GateOperation =>
  unitaryGate(haarUnitary(4, draw), [a, b]);

/** A staircase of generic gates, width 2, with words of far-away carriers in between. */
function planted(n: number, words: number, seed: number): Circuit {
  const draw = random('planted', seed);
  const operations: GateOperation[] = [];
  for (let k = 0; k + 1 < n; k++) {
    operations.push(generic(draw, k, k + 1));
    if (k % Math.max(1, Math.floor(n / words)) === 0) {
      const far = (k + 2 + Math.floor(draw() * (n - 3))) % n;
      if (far !== k && far !== k + 1) operations.push(...word(k, k + 1, far));
    }
  }
  return { ...emptyCircuit(n), operations };
}

/** Each window as a chain of blocks along its order. */
function asChains(windows: readonly Window[]): Replacement[] {
  return windows.map(({ unitary, carriers, order, needs }) => {
    const chain = factorChain(unitary, carriers.length, { order, needs });
    const operations = chain.stages.flatMap(({ blocks }) =>
      blocks.map(({ wires, matrix }) =>
        unitaryGate(
          matrix,
          wires.map((w) => carriers[w]!),
        ),
      ),
    );
    const places = carriers.slice();
    for (const { leaves } of chain.stages) {
      for (const { output, carrier } of leaves) places[output] = carriers[carrier]!;
    }
    return { operations, places };
  });
}

function reshaped(circuit: Circuit) {
  const contract = contractOf(circuit);
  const plan = planStructure(circuit, contract);
  const found = planWindows(plan);
  const after = withWindows(plan, found.windows, asChains(found.windows));
  const { narrowed } = bestAt(after, after.width.width);
  return { plan, found, after, narrowed, contract };
}

describe('windows', () => {
  test.each([1, 2, 3])('a planted word is found and undone, 5 wires, seed %i', (seed) => {
    const circuit = planted(5, 2, seed);
    const { plan, found, narrowed, contract } = reshaped(circuit);
    expect(found.width.width).toBe(2);
    expect(plan.width.width).toBeGreaterThan(2);
    expect(narrowed.circuit.wires).toBe(2);
    const inputs = randomInputs(contract, seed);
    const before = simulate(circuit, inputs, contract, 0);
    const after = simulate(narrowed.circuit, inputs, contract, 0);
    expect(outcomeGap(before, after)).toBeLessThan(1e-11);
  });

  test.each([
    [30, 5],
    [60, 10],
    [100, 12],
  ])('planted openings in %i wires, %i words: all found', (n, words) => {
    const { plan, found, after, narrowed } = reshaped(planted(n, words, n));
    expect(plan.width.width).toBeGreaterThan(3);
    expect(found.width.width).toBe(2);
    expect(after.width.width).toBe(2);
    expect(narrowed.circuit.wires).toBe(2);
    for (const { carriers } of found.windows) expect(carriers.length).toBeLessThanOrEqual(4);
  });

  test('nothing to find: no window', () => {
    const draw = random('none');
    const operations = Array.from({ length: 12 }, (_, k) =>
      generic(draw, k % 5, (k * 2 + 1) % 5 === k % 5 ? (k + 1) % 5 : (k * 2 + 1) % 5),
    );
    const { found } = reshaped({ ...emptyCircuit(5), operations });
    expect(found.windows).toEqual([]);
    expect(found.width.width).toBe(found.structuralWidth);
  });

  test.each([1, 2, 3, 4, 5, 6, 7, 8])(
    'random small circuits: sound and never below the dense width, seed %i',
    (seed) => {
      const draw = random('windows', seed);
      const n = 4 + (seed % 2);
      const names = ['cx', 'h', 'cx', 't', 'cz', 'cx', 's'];
      const operations = Array.from({ length: 22 }, () => {
        const name = names[Math.floor(draw() * names.length)]!;
        const a = Math.floor(draw() * n);
        const b = (a + 1 + Math.floor(draw() * (n - 1))) % n;
        return gate(name, name.startsWith('c') ? [a, b] : [a]);
      });
      const circuit = { ...emptyCircuit(n), operations };
      const { found, after, narrowed, contract } = reshaped(circuit);
      const { kept } = influenceTables(circuitUnitary(circuit), n);
      const dense = planWidth(relationFromTable(kept, n, influenceFloor(n))).width;
      expect(found.width.width).toBeGreaterThanOrEqual(dense);
      expect(after.width.width).toBe(found.width.width);
      const inputs = randomInputs(contract, seed);
      const gap = outcomeGap(
        simulate(circuit, inputs, contract, 0),
        simulate(narrowed.circuit, inputs, contract, 0),
      );
      expect(gap).toBeLessThan(1e-10);
    },
  );
});
