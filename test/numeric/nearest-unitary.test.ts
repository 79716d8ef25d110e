import { expect, test } from 'vitest';
import { unitarityError } from '../../src/numeric/complex-matrix.ts';
import { nearestUnitary } from '../../src/numeric/nearest-unitary.ts';
import { normal, random } from '../../src/numeric/random.ts';
import { haarUnitary, polarFactor } from '../../src/numeric/svd.ts';

test.each([
  [2, 1e-9],
  [8, 1e-6],
  [16, 1e-3],
  [4, 0.5],
])('%i rows, noise %f: unitary to rounding and equal to the polar factor', (n, noise) => {
  const draw = random(n, 'noise');
  const u = haarUnitary(n, draw);
  const noisy = u.map((x) => x + noise * normal(draw));
  const nearest = nearestUnitary(noisy, n);
  expect(unitarityError(nearest, n)).toBeLessThan(1e-15 * n * 4);
  const polar = polarFactor(noisy, n);
  const gap = nearest.reduce((worst, x, k) => Math.max(worst, Math.abs(x - polar[k]!)), 0);
  expect(gap).toBeLessThan(1e-13);
});
