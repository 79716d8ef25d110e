import { describe, expect, test } from 'vitest';
import { simdKernels } from '../../src/numeric/kernels/kernels.ts';
import { plainKernels } from '../../src/numeric/kernels/plain.ts';
import { normal, random } from '../../src/numeric/random.ts';

function draw(size: number, ...seed: (string | number)[]): Float64Array {
  const source = random(...seed);
  return Float64Array.from({ length: size }, () => normal(source));
}

const twins = [plainKernels, simdKernels()!] as const;

test('this engine runs the compiled kernels', () => {
  expect(simdKernels()).toBeDefined();
});

describe('the compiled kernels return the bytes of their plain twins', () => {
  test.each([1, 2, 3, 4, 5, 7, 16, 33])('normal matrix of %i angles', (p) => {
    for (const m of [1, 2, 7, 64]) {
      const j = draw(p * m, 'gram', p, m);
      const [a, b] = twins.map((twin) => {
        const out = new Float64Array(p * p).fill(9);
        twin.gramInto(out, j, p, m);
        return out;
      });
      expect(b).toEqual(a);
      for (let r = 0; r < p; r++) {
        for (let s = 0; s < p; s++) {
          let sum = 0;
          for (let k = 0; k < m; k++) sum += j[r * m + k]! * j[s * m + k]!;
          // above the diagonal nothing is written
          expect(a![r * p + s]).toBeCloseTo(s > r ? 9 : sum, 10);
        }
      }
    }
  });

  test.each([
    [1, 1, 1],
    [3, 5, 7],
    [8, 8, 8],
    [16, 16, 3],
    [32, 32, 32],
  ])('product %i x %i x %i', (m, k, n) => {
    const [x, y] = [draw(2 * m * k, 'a', m), draw(2 * k * n, 'b', n)];
    const [a, b] = twins.map((twin) => {
      const out = new Float64Array(2 * m * n);
      twin.multiplyInto(out, x, y, m, k, n);
      return out;
    });
    expect(b).toEqual(a);
  });

  test.each([2, 4, 8, 16, 32])('projector square at %i', (d) => {
    const half = draw(d * d, 'square', d);
    const [a, b] = twins.map((twin) => {
      const out = new Float64Array(2 * d * d).fill(9);
      twin.squareInto(out, half, d / 2, d);
      return out;
    });
    expect(b!.every((v, k) => v === a![k])).toBe(true);
    // Hermitian, and the top left entry is 2 |first column|^2 - 1
    let norm = 0;
    for (let r = 0; r < d / 2; r++) norm += half[r * d]! ** 2 + half[(d * d) / 2 + r * d]! ** 2;
    expect(a![0]).toBeCloseTo(2 * norm - 1, 10);
    expect(a![d]).toBe(a![1]);
    expect(a![d * d + d]).toBe(-a![d * d + 1]!);
  });

  test.each([1, 2, 3, 4, 9, 20, 65])('Cholesky factor of %i', (p) => {
    const j = draw(p * 2 * p, 'cholesky', p);
    const a = new Float64Array(p * p);
    plainKernels.gramInto(a, j, p, 2 * p);
    const shift = draw(p, 'shift', p).map(Math.abs);
    const [l, other] = twins.map((twin) => {
      const out = new Float64Array(p * p);
      expect(twin.choleskyInto(out, a, shift, p)).toBe(true);
      return out;
    });
    expect(other).toEqual(l);
    for (let r = 0; r < p; r++) {
      for (let s = 0; s <= r; s++) {
        let sum = 0;
        for (let k = 0; k <= s; k++) sum += l![r * p + k]! * l![s * p + k]!;
        expect(sum).toBeCloseTo(a[r * p + s]! + (r === s ? shift[r]! : 0), 8);
      }
    }
  });

  test('both refuse a matrix that is not positive definite', () => {
    const a = Float64Array.of(1, 0, 0, 2, 1, 0, 0, 0, 1);
    for (const twin of twins) {
      expect(twin.choleskyInto(new Float64Array(9), a, new Float64Array(3), 3)).toBe(false);
    }
  });
});
