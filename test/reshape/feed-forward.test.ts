import { describe, expect, test } from 'vitest';
import { emptyCircuit, type GateOperation, gate } from '../../src/circuit/circuit.ts';
import { applyMatrixInto, circuitUnitary } from '../../src/circuit/unitary.ts';
import { identity } from '../../src/numeric/complex-matrix.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { type FeedStep, factorFeedForward } from '../../src/reshape/feed-forward.ts';
import { influenceTables } from '../../src/survey/influence.ts';
import { inputsOf, relationFromTable } from '../../src/survey/relation.ts';
import { planWidth } from '../../src/survey/width.ts';

function factor(u: Float64Array, n: number): FeedStep[] {
  const relation = relationFromTable(influenceTables(u, n).measured, n, 1e-10);
  const needs = Array.from({ length: n }, (_, out) => inputsOf(relation, out));
  const { order } = planWidth(relation);
  const steps = factorFeedForward(u, n, { order, needs }, new Array<boolean>(n).fill(true));
  if (!steps) throw new Error(`no factorisation of a ${n}-wire unitary`);
  return steps;
}

function widthOf(steps: readonly FeedStep[]): number {
  let present = 0;
  let most = 0;
  for (const { kind } of steps) {
    if (kind === 'enter') most = Math.max(most, ++present);
    if (kind === 'leave') present--;
  }
  return most;
}

/** For each string of bits, 1 - |<row of u, row of the chain with these bits>|: the largest. */
function worstRowError(u: Float64Array, n: number, steps: readonly FeedStep[]): number {
  const d = 2 ** n;
  let worst = 0;
  for (let bits = 0; bits < d; bits++) {
    const bitOf = (output: number): number => (bits >> (n - 1 - output)) & 1;
    const v = identity(d);
    let row = 0;
    for (const step of steps) {
      if (step.kind === 'leave') row += bitOf(step.output) * 2 ** (n - 1 - step.carrier);
      if (step.kind !== 'block') continue;
      if (step.when.every(({ output, value }) => bitOf(output) === value)) {
        applyMatrixInto(v, step.matrix, step.wires, n, d);
      }
    }
    let [re, im] = [0, 0];
    for (let c = 0; c < d; c++) {
      const [a, b] = [u[bits * d + c]!, u[d * d + bits * d + c]!];
      const [x, y] = [v[row * d + c]!, v[d * d + row * d + c]!];
      re += a * x + b * y;
      im += a * y - b * x;
    }
    worst = Math.max(worst, Math.abs(1 - Math.hypot(re, im)));
  }
  return worst;
}

describe('factoring with measured outputs', () => {
  for (const n of [3, 4, 5]) {
    test(`the Fourier transform on ${n} wires: one wire, single-bit conditions (Griffiths, Niu 1996)`, () => {
      const operations: GateOperation[] = [];
      for (let i = 0; i < n; i++) {
        operations.push(gate('h', [i]));
        for (let j = i + 1; j < n; j++) {
          operations.push(gate('cp', [j, i], Math.PI / 2 ** (j - i)));
        }
      }
      for (let i = 0; i < n >> 1; i++) operations.push(gate('swap', [i, n - 1 - i]));
      const u = circuitUnitary({ ...emptyCircuit(n), operations });
      const steps = factor(u, n);
      expect(widthOf(steps)).toBe(1);
      expect(worstRowError(u, n, steps)).toBeLessThan(1e-13);
      const conditioned = steps.filter((step) => step.kind === 'block' && step.when.length > 0);
      expect(conditioned.length).toBe((n * (n - 1)) / 2);
      for (const step of steps) if (step.kind === 'block') expect(step.when.length).toBeLessThan(2);
    });
  }

  test('blocks that depend on the bits before: variants', () => {
    const n = 5;
    const d = 2 ** n;
    const draw = random(2, 'variants');
    const u = identity(d);
    applyMatrixInto(u, haarUnitary(8, draw), [0, 1, 2], n, d);
    for (const value of [0, 16]) {
      applyMatrixInto(u, haarUnitary(8, draw), [1, 2, 3], n, d, 16, value);
    }
    for (const value of [0, 8, 16, 24]) {
      applyMatrixInto(u, haarUnitary(8, draw), [2, 3, 4], n, d, 24, value);
    }
    const steps = factor(u, n);
    expect(widthOf(steps)).toBe(3);
    expect(worstRowError(u, n, steps)).toBeLessThan(1e-13);
  });

  test('the control of a CX is free of its target as measured', () => {
    const u = circuitUnitary({ ...emptyCircuit(2), operations: [gate('cx', [0, 1])] });
    const steps = factor(u, 2);
    expect(widthOf(steps)).toBe(1);
    expect(worstRowError(u, 2, steps)).toBeLessThan(1e-15);
  });
});
