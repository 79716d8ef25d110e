import { describe, expect, test } from 'vitest';
import { random } from '../../src/numeric/random.ts';
import { emptyRelation, type Relation, relate } from '../../src/survey/relation.ts';
import { planWidth } from '../../src/survey/width.ts';
import { lowerBoundOf, transposed } from '../../src/survey/width-bound.ts';
import { widthOfOrder } from '../../src/survey/width-plan.ts';
import { searchOrder } from '../../src/survey/width-search.ts';
import { cubic, type Edge, grid, layerRelation, path, ring, tree } from './graphs.ts';

function randomRelation(outputs: number, inputs: number, density: number, seed: number): Relation {
  const draw = random('relation', seed);
  const relation = emptyRelation(outputs, inputs);
  for (let i = 0; i < outputs; i++) {
    for (let j = 0; j < inputs; j++) if (i === j || draw() < density) relate(relation, i, j);
  }
  return relation;
}

function permutations(n: number): number[][] {
  if (n === 0) return [[]];
  return permutations(n - 1).flatMap((p) =>
    Array.from({ length: n }, (_, k) => [...p.slice(0, k), n - 1, ...p.slice(k)]),
  );
}

describe('the exact planner', () => {
  test.each([1, 2, 3, 4, 5, 6])('finds the least of all orders, seed %i', (seed) => {
    const relation = randomRelation(6, 6, 0.1 + 0.1 * (seed % 4), seed);
    const least = Math.min(...permutations(6).map((order) => widthOfOrder(relation, order)));
    const plan = planWidth(relation);
    expect(plan.width).toBe(least);
    expect(widthOfOrder(relation, plan.order)).toBe(least);
    expect(plan.exact).toBe(true);
  });
  test('takes more inputs than fit in one word', () => {
    const relation = emptyRelation(3, 70);
    for (let j = 0; j < 70; j++) relate(relation, j % 3, j);
    // 24 + 23 + 23 inputs: two outputs leave, the smaller ones first
    expect(planWidth(relation).width).toBe(68);
  });
  test('ties: low outputs leave first', () => {
    expect(planWidth(layerRelation(5, [])).order).toEqual([0, 1, 2, 3, 4]);
  });
});

describe('one layer of commuting gates: width = pathwidth + 1', () => {
  const cases: [string, number, Edge[], number][] = [
    ['path of 40', 40, path(40), 2],
    ['ring of 40', 40, ring(40), 3],
    ['path of 9', 9, path(9), 2],
    ['ring of 9', 9, ring(9), 3],
    ...[2, 3, 4, 5, 6].map((k): [string, number, Edge[], number] => [
      `grid ${k} x 8`,
      8 * k,
      grid(k, 8),
      k + 1,
    ]),
    ['grid 3 x 3', 9, grid(3, 3), 4],
    // complete ternary trees with h levels below the root have pathwidth h; binary ones ceil(h / 2)
    ['ternary tree, 2 levels below', tree(3, 3).vertices, tree(3, 3).edges, 3],
    ['ternary tree, 3 levels below', tree(3, 4).vertices, tree(3, 4).edges, 4],
    ['binary tree, 4 levels below', tree(2, 5).vertices, tree(2, 5).edges, 3],
    ['binary tree, 6 levels below', tree(2, 7).vertices, tree(2, 7).edges, 4],
  ];
  test.each(cases)('%s', (_, n, edges, width) => {
    const relation = layerRelation(n, edges);
    const plan = planWidth(relation, { effort: 30 });
    expect(plan.width).toBe(width);
    expect(widthOfOrder(relation, plan.order)).toBe(width);
    expect(plan.lowerBound).toBeLessThanOrEqual(width);
  });
  // published width 20 (arXiv:2210.08039); pathwidth about n/6 (Fomin, Hoie, IPL 97, 191 (2006))
  test.each(Array.from({ length: 20 }, (_, k) => k + 1))(
    'random cubic graph of 80 vertices, seed %i: 16 or fewer',
    (seed) => {
      const relation = layerRelation(80, cubic(80, seed));
      const plan = planWidth(relation, { effort: 15 });
      expect(plan.width).toBeLessThanOrEqual(16);
      expect(plan.lowerBound).toBeLessThanOrEqual(plan.width);
    },
  );
});

describe('search and bounds', () => {
  test.each([1, 2, 3, 4, 5, 6, 7, 8])('against the exact planner, seed %i', (seed) => {
    const relation = randomRelation(14, 14, 0.05 + 0.05 * (seed % 4), seed);
    const exact = planWidth(relation).width;
    const bound = lowerBoundOf(relation);
    expect(bound).toBeLessThanOrEqual(exact);
    const found = searchOrder(relation, bound, { effort: 5 });
    expect(found.width).toBe(exact);
    expect(found.lowerBound).toBeLessThanOrEqual(exact);
    expect(widthOfOrder(relation, found.order)).toBe(found.width);
  });
  test('the same relation gives the same order', () => {
    const relation = layerRelation(60, cubic(60, 5));
    expect(searchOrder(relation, 1, { effort: 5 })).toEqual(
      searchOrder(relation, 1, { effort: 5 }),
    );
  });
  test.each([1, 2, 3, 4, 5, 6, 7, 8, 9, 10])(
    'a relation and its time reverse have equal widths, seed %i (arXiv:2210.08039)',
    (seed) => {
      const relation = randomRelation(11, 11, 0.04 * seed, seed);
      expect(planWidth(transposed(relation)).width).toBe(planWidth(relation).width);
    },
  );
});
