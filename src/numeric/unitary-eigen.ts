/**
 * Diagonalises unitary matrices and takes their powers.
 *
 * Shape: u is n x n, row-major, planar; `phases[j]` is the angle of eigenvalue j in (-pi, pi], `vectors` has
 * the eigenvectors in its columns.
 * Method: a unitary is normal, so its Hermitian and anti-Hermitian parts commute: u = H + i K. They are
 * diagonalised together (`jointEigen`), which is safe for repeated eigenvalues.
 * Cost: that of `jointEigen` for two matrices.
 */
import { fromEigen, jointEigen } from './hermitian-eigen.ts';

/** Eigenphases closer to -pi than this count as pi, so that the principal branch does not flip by rounding. */
const BRANCH_WIDTH = 1e-12;

export function unitaryEigen(
  u: Float64Array,
  n: number,
): { phases: Float64Array; vectors: Float64Array } {
  const h = new Float64Array(2 * n * n);
  const k = new Float64Array(2 * n * n);
  const im = n * n;
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      const [a, b] = [u[i * n + j]!, u[im + i * n + j]!];
      const [c, d] = [u[j * n + i]!, -u[im + j * n + i]!];
      h[i * n + j] = (a + c) / 2;
      h[im + i * n + j] = (b + d) / 2;
      // (u - u^dag) / 2i
      k[i * n + j] = (b - d) / 2;
      k[im + i * n + j] = -(a - c) / 2;
    }
  }
  const { values, vectors } = jointEigen([h, k], n);
  const phases = Float64Array.from({ length: n }, (_, j) => {
    const phase = Math.atan2(values[1]![j]!, values[0]![j]!);
    return phase <= -Math.PI + BRANCH_WIDTH ? Math.PI : phase;
  });
  return { phases, vectors };
}

/** The principal power u^exponent: eigenphases are taken in (-pi, pi] and multiplied by the exponent. */
export function unitaryPower(u: Float64Array, n: number, exponent: number): Float64Array {
  const { phases, vectors } = unitaryEigen(u, n);
  const re = phases.map((phase) => Math.cos(exponent * phase));
  const im = phases.map((phase) => Math.sin(exponent * phase));
  return fromEigen(vectors, re, im, n);
}
