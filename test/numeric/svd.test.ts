import { describe, expect, test } from 'vitest';
import { adjoint, identity, mul } from '../../src/numeric/complex-matrix.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary, svd } from '../../src/numeric/svd.ts';

const difference = (a: Float64Array, b: Float64Array): number =>
  a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);

/** u diag(s) with the columns of u scaled. */
const scaled = (u: Float64Array, s: ArrayLike<number>, n: number): Float64Array =>
  u.map((x, k) => x * s[k % n]!);

/** The laws of a singular value decomposition, relative to the largest singular value. */
function errorsOf(a: Float64Array, m: number, n: number): number {
  const { u, s, v } = svd(a, m, n);
  const again = mul(scaled(u, s, n), adjoint(v, n), m, n, n);
  return Math.max(
    difference(again, a) / (s[0]! || 1),
    difference(mul(adjoint(v, n), v, n), identity(n)),
    difference(mul(adjoint(u, m, n), u, n, m, n), identity(n)),
    ...Array.from(s).map((x, k) => (k > 0 && x > s[k - 1]! ? 1 : 0)),
  );
}

describe('singular values (seed 31)', () => {
  const draw = random(31);
  test.each([
    ['full rank', (n: number) => Array.from({ length: n }, (_, k) => 1 + k)],
    ['rank deficient', (n: number) => Array.from({ length: n }, (_, k) => (k < n / 2 ? 1 + k : 0))],
    ['repeated', (n: number) => Array.from({ length: n }, (_, k) => (k < n / 2 ? 1 : 0.5))],
    ['tiny', (n: number) => Array.from({ length: n }, (_, k) => 1e-200 * (1 + k))],
    ['wide range', (n: number) => Array.from({ length: n }, (_, k) => 10 ** (-20 * k))],
    ['zero', (n: number) => new Array<number>(n).fill(0)],
  ] as const)('%s', (_, values) => {
    for (const n of [1, 2, 3, 5, 8]) {
      for (let round = 0; round < 10; round++) {
        const [u, v] = [haarUnitary(n, draw), haarUnitary(n, draw)];
        const a = mul(scaled(u, values(n), n), v, n);
        expect(errorsOf(a, n, n)).toBeLessThan(1e-13);
      }
    }
  });

  test('columns that are sums of others, whose rests underflow when they are turned again and again', () => {
    for (let round = 0; round < 400; round++) {
      const n = 8;
      const rank = 1 + (round % 5);
      const a = new Float64Array(2 * n * n);
      const parts = Array.from({ length: rank }, () =>
        Array.from({ length: 4 * n }, () => Math.round(4 * draw() - 2) / 4),
      );
      for (const part of parts) {
        for (let i = 0; i < n; i++) {
          for (let j = 0; j < n; j++) {
            const [x, y, p, q] = [part[i]!, part[n + i]!, part[2 * n + j]!, part[3 * n + j]!];
            a[i * n + j]! += x * p - y * q;
            a[n * n + i * n + j]! += x * q + y * p;
          }
        }
      }
      expect(errorsOf(a, n, n)).toBeLessThan(1e-13);
    }
  });
});
