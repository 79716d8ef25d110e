import { describe, expect, test } from 'vitest';
import { emptyCircuit, gate } from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { distanceFromInfidelity } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { jointInfluence, nearestPlan } from '../../src/reshape/causal-bound.ts';
import {
  type ChainPlan,
  chainBlocks,
  chainDistance,
  chainWidth,
  factorChain,
} from '../../src/reshape/chain.ts';
import { improveChain } from '../../src/reshape/improve-chain.ts';
import { influenceTables } from '../../src/survey/influence.ts';
import { inputsOf, relationFromTable } from '../../src/survey/relation.ts';
import { planWidth } from '../../src/survey/width.ts';
import { perturbed, plantedChain } from './planted-chain.ts';

function planFromMatrix(u: Float64Array, n: number): ChainPlan & { width: number } {
  const relation = relationFromTable(influenceTables(u, n).kept, n, 1e-20);
  const { order, width } = planWidth(relation);
  return { order, width, needs: Array.from({ length: n }, (_, out) => inputsOf(relation, out)) };
}

describe('factoring planted chains', () => {
  const shapes = [
    [3, 2],
    [4, 2],
    [4, 3],
    [5, 2],
    [5, 3],
    [5, 4],
    [6, 2],
    [6, 3],
    [6, 4],
  ] as const;
  for (const [n, width] of shapes) {
    test(`${n} wires, planted width ${width}: found, and rebuilt to rounding (seed 5)`, () => {
      const { u } = plantedChain(n, width, 5);
      const plan = planFromMatrix(u, n);
      expect(plan.width).toBe(width);
      const chain = factorChain(u, n, plan);
      expect(chainWidth(chain)).toBe(width);
      expect(chainDistance(u, chain)).toBeLessThan(1e-27);
      for (const { wires } of chainBlocks(chain)) expect(wires.length).toBeLessThanOrEqual(width);
    });
  }

  test('a generic unitary has no free pair', () => {
    const u = haarUnitary(16, random(3, 'generic'));
    expect(planFromMatrix(u, 4).width).toBe(4);
  });

  test('the Fourier transform as a block needs every wire', () => {
    const n = 4;
    const operations = [];
    for (let i = 0; i < n; i++) {
      operations.push(gate('h', [i]));
      for (let j = i + 1; j < n; j++) operations.push(gate('cp', [j, i], Math.PI / 2 ** (j - i)));
    }
    const u = circuitUnitary({ ...emptyCircuit(n), operations });
    expect(planFromMatrix(u, n).width).toBe(n);
  });

  test('wires that have nothing to do with each other stay apart', () => {
    const operations = [gate('cx', [0, 2]), gate('t', [2]), gate('cx', [1, 3]), gate('h', [3])];
    const u = circuitUnitary({ ...emptyCircuit(4), operations });
    const chain = factorChain(u, 4, planFromMatrix(u, 4));
    expect(chainWidth(chain)).toBe(2);
    expect(chainDistance(u, chain)).toBeLessThan(1e-27);
  });
});

describe('the bound on narrower circuits', () => {
  test('one output and one input: the entry of the influence table', () => {
    const u = haarUnitary(8, random(4, 'bound'));
    const { kept } = influenceTables(u, 3);
    for (let out = 0; out < 3; out++) {
      for (let input = 0; input < 3; input++) {
        const joint = jointInfluence(u, 3, [out], [input]);
        expect(joint).toBeCloseTo(kept[out * 3 + input]!, 13);
      }
    }
  });

  test('a planted chain costs nothing at its own width, something below', () => {
    const { u } = plantedChain(5, 3, 8);
    const { kept } = influenceTables(u, 5);
    expect(nearestPlan(u, 5, 3, kept).lower).toBeLessThan(1e-14);
    expect(nearestPlan(u, 5, 2, kept).lower).toBeGreaterThan(0.01);
  });

  for (const [n, width, ratioMin] of [
    [4, 3, 0.99],
    [5, 3, 0.7],
    [4, 2, 0.7],
  ] as const) {
    test(`a perturbed chain, ${n} to ${width}: the bound lies below what is reached, and near`, () => {
      for (const size of [1e-3, 1e-2, 0.1]) {
        const u = perturbed(plantedChain(n, width, 6).u, 2 ** n, size, 7);
        const { kept } = influenceTables(u, n);
        const { lower, plan } = nearestPlan(u, n, width, kept);
        const start = factorChain(u, n, plan, 10 * size * size);
        expect(chainWidth(start)).toBe(width);
        const { chain, distance } = improveChain(u, start);
        expect(chainDistance(u, chain)).toBeCloseTo(distance, 15);
        const lowest = distanceFromInfidelity(lower);
        expect(lowest).toBeLessThanOrEqual(distance);
        expect(lowest / distance).toBeGreaterThan(ratioMin - size);
      }
    });
  }

  test('polar updates never make it worse, from a chain that is far off too', () => {
    const u = haarUnitary(16, random(9, 'far'));
    const { kept } = influenceTables(u, 4);
    const { lower, plan } = nearestPlan(u, 4, 3, kept);
    const start = factorChain(u, 4, plan, 1e-3);
    const before = chainDistance(u, start);
    const { distance } = improveChain(u, start);
    expect(distance).toBeLessThan(before);
    expect(distance).toBeGreaterThan(distanceFromInfidelity(lower));
  });
});
