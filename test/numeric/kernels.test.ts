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

  test.each([1, 2, 3, 4, 9, 20, 65, 121])('Cholesky factor of %i', (p) => {
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

  test.each([1, 2, 3, 8, 9, 31, 65, 121])('solution of %i equations', (p) => {
    const j = draw(p * 2 * p, 'solve', p);
    const a = new Float64Array(p * p);
    plainKernels.gramInto(a, j, p, 2 * p);
    const shift = draw(p, 'shift', p).map(Math.abs);
    const b = draw(p, 'right', p);
    const [x, other] = twins.map((twin) => {
      const out = b.slice();
      expect(twin.solveInto(out, a, shift, p)).toBe(true);
      return out;
    });
    expect(other).toEqual(x);
    for (let r = 0; r < p; r++) {
      let sum = shift[r]! * x![r]!;
      for (let s = 0; s < p; s++) sum += a[s > r ? s * p + r : r * p + s]! * x![s]!;
      expect(sum).toBeCloseTo(b[r]!, 8);
    }
  });

  test.each([1, 2, 3, 4, 5])('sweeps over a chain on %i wires', (n) => {
    const d = 2 ** n;
    const stride = (wire: number): number => 2 ** (n - 1 - (wire % n));
    const steps: number[] = [];
    let angles = 0;
    for (let k = 0; k < 12; k++) {
      steps.push(k % 3, stride(k), 0, angles++);
      if (n === 1) continue;
      if (k % 3 === 1) steps.push(3, stride(k), stride(k + 1), 0);
      if (k % 3 === 2) steps.push(4, stride(k + 1), stride(k), k % 2);
    }
    const matrices = draw(64, 'pairs', n).map((x) => x / 4);
    const sweep = { d, angles, steps: Int32Array.from(steps), matrices };
    const turns = new Float64Array(2 * angles);
    for (let k = 0; k < angles; k++) {
      turns[2 * k] = Math.cos(k + 1);
      turns[2 * k + 1] = Math.sin(k + 1);
    }
    const target = draw(2 * d * d, 'target', n);
    const [a, b] = twins.map((twin) => {
      const x = twin.evolveInto(new Float64Array(2 * d * d), sweep, turns);
      const rows = new Float64Array(angles * d * d);
      const again = twin.rowsInto(rows, new Float64Array(2 * d * d), sweep, turns);
      expect(again).toEqual(x);
      const gap = twin.gapOf(sweep, turns, target);
      const [slope, gradient] = [new Float64Array(angles), new Float64Array(angles)];
      const normal = new Float64Array(angles * angles);
      expect(twin.slopeInto(slope, sweep, turns, target)).toBe(gap);
      expect(twin.lineariseInto(normal, gradient, sweep, turns, target)).toBe(gap);
      for (let r = 0; r < angles; r++) normal.fill(0, r * angles + r + 1, (r + 1) * angles);
      return { x, rows, gap, slope, gradient, normal };
    });
    expect(b).toEqual(a);
    // two roads to one gradient; they agree only where every step is unitary
    if (n === 1) for (const [k, g] of a!.gradient.entries()) expect(a!.slope[k]).toBeCloseTo(g, 10);
  });

  test('both refuse a matrix that is not positive definite', () => {
    const a = Float64Array.of(1, 0, 0, 2, 1, 0, 0, 0, 1);
    for (const twin of twins) {
      expect(twin.choleskyInto(new Float64Array(9), a, new Float64Array(3), 3)).toBe(false);
      const b = Float64Array.of(1, 2, 3);
      expect(twin.solveInto(b, a, new Float64Array(3), 3)).toBe(false);
      expect([...b]).toEqual([1, 2, 3]);
    }
  });
});
