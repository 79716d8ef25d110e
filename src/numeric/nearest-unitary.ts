/**
 * Removes the rounding from a matrix that is nearly unitary: its unitary polar factor.
 *
 * Shape: a is n x n, row-major, planar.
 * Method: Newton-Schulz iteration X <- X (3 - X^dag X)/2, which converges quadratically to the polar factor when
 * all singular values are in (0, sqrt 3) (Higham, Functions of Matrices (2008), eq. 8.20); beyond an error of
 * 0.1 the singular value decomposition is used.
 * Cost: two products (16 n^3 flops) per step, 2 to 4 steps.
 */
import { adjoint, mul, normSquared } from './complex-matrix.ts';
import { polarFactor } from './svd.ts';

const STEPS_MAX = 8;

export function nearestUnitary(a: Float64Array, n: number): Float64Array {
  let x = a;
  for (let step = 0; step < STEPS_MAX; step++) {
    const gap = mul(adjoint(x, n), x, n);
    for (let i = 0; i < n; i++) gap[i * n + i]! -= 1;
    const error = Math.sqrt(normSquared(gap));
    if (!(error < 0.1)) return polarFactor(a, n);
    if (error < 1e-15 * n) return x;
    // X - X (X^dag X - 1)/2
    const change = mul(x, gap, n);
    x = x.map((value, k) => value - change[k]! / 2);
    if (error < 1e-9) return x;
  }
  return x;
}
