import { describe, expect, test } from 'vitest';
import { identity, mul, unitarityError } from '../../src/numeric/complex-matrix.ts';
import { type CosineSine, cosineSine, fromQuarters } from '../../src/numeric/cosine-sine.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

const gap = (a: Float64Array, b: Float64Array): number =>
  a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);

function diagonal(values: ArrayLike<number>): Float64Array {
  const m = values.length;
  const out = new Float64Array(2 * m * m);
  for (let k = 0; k < m; k++) out[k * m + k] = values[k]!;
  return out;
}

function recomposed({ l1, l2, angles, r1, r2 }: CosineSine, m: number): Float64Array {
  const c = diagonal(angles.map(Math.cos));
  const s = diagonal(angles.map(Math.sin));
  const minus = s.map((x) => -x);
  const left = fromQuarters([l1, null, null, l2], m);
  const right = fromQuarters([r1, null, null, r2], m);
  return mul(mul(left, fromQuarters([c, minus, s, c], m), 2 * m), right, 2 * m);
}

function planted(angles: readonly number[], draw: Random): Float64Array {
  const m = angles.length;
  const part = (): Float64Array => haarUnitary(m, draw);
  const [l1, l2, r1, r2] = [part(), part(), part(), part()];
  return recomposed({ l1, l2, r1, r2, angles: Float64Array.from(angles) }, m);
}

function holds(u: Float64Array, m: number): CosineSine {
  const found = cosineSine(u, m);
  for (const part of [found.l1, found.l2, found.r1, found.r2]) {
    expect(unitarityError(part, m)).toBeLessThan(1e-13);
  }
  expect(gap(u, recomposed(found, m))).toBeLessThan(1e-13);
  found.angles.forEach((angle, k) => {
    expect(angle).toBeGreaterThanOrEqual(0);
    expect(angle).toBeLessThanOrEqual(Math.PI / 2);
    if (k > 0) expect(angle).toBeGreaterThan(found.angles[k - 1]! - 1e-12);
  });
  return found;
}

describe('cosine-sine decomposition', () => {
  test.each([1, 2, 4, 8, 16, 32])('random unitaries of size 2 x %i recompose', (m) => {
    const draw = random(1, 'cosine-sine', m);
    for (let k = 0; k < 6; k++) holds(haarUnitary(2 * m, draw), m);
  });

  const quarter = Math.PI / 2;
  test.each([
    ['all zero', [0, 0, 0, 0]],
    ['all a right angle', [quarter, quarter, quarter, quarter]],
    ['both ends', [0, 0, quarter, quarter]],
    ['equal in between', [0.4, 0.4, 0.4, 0.4]],
    ['the middle', [Math.PI / 4, Math.PI / 4, Math.PI / 4, Math.PI / 4]],
    ['tiny ones', [1e-16, 1e-12, 1e-9, 1e-5]],
    ['nearly right angles', [quarter - 1e-5, quarter - 1e-9, quarter - 1e-12, quarter]],
    ['tiny and nearly right', [1e-13, 1e-8, quarter - 1e-8, quarter - 1e-13]],
    ['pairs a rounding apart', [0.3, 0.3 + 1e-15, 1.2, 1.2 + 1e-14]],
    ['across the middle', [0.7853, 0.7854, 0.78539816, 0.78539817]],
  ])('planted angles come back: %s', (_, angles) => {
    const draw = random(2, 'planted');
    for (let k = 0; k < 8; k++) {
      const found = holds(planted(angles, draw), 4);
      const wanted = angles.slice().sort((a, b) => a - b);
      wanted.forEach((angle, at) => {
        expect(Math.abs(found.angles[at]! - angle)).toBeLessThan(1e-13);
      });
    }
  });

  test('identity, a swap of the halves, signs and permutations', () => {
    holds(identity(8), 4);
    holds(
      identity(8).map((x) => -x),
      4,
    );
    const one = identity(4);
    holds(fromQuarters([null, one, one, null], 4), 4);
    for (let seed = 0; seed < 10; seed++) {
      const draw = random(seed, 'permutation');
      const order = Array.from({ length: 8 }, (_, k) => ({ k, at: draw() })).sort((a, b) => a.at - b.at); // biome-ignore format: one permutation
      const u = new Float64Array(128);
      order.forEach(({ k }, row) => {
        u[row * 8 + k] = draw() < 0.5 ? 1 : -1;
      });
      holds(u, 4);
    }
  });
});
