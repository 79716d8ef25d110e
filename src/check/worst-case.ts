/**
 * The worst case over all inputs: half the diamond distance of two unitaries.
 *
 * Method: sqrt(1 - r^2) with r the distance from 0 to the convex hull of the eigenvalues of u^dag v (Aharonov, Kitaev,
 * Nisan, STOC 1998; Watrous, The Theory of Quantum Information, section 3.3). Eigenvalues on an arc of length
 * a < pi give r = cos(a/2), so the result is sin(a/2), without cancellation; on a longer arc it is 1.
 * Shape: u, v are d x d, planar. Cost: one joint diagonalisation, d <= `WORST_CASE_ROWS_MAX`.
 */
import { adjoint, mul } from '../numeric/complex-matrix.ts';
import { unitaryEigen } from '../numeric/unitary-eigen.ts';

export const WORST_CASE_ROWS_MAX = 64;

export function worstCaseDistance(u: Float64Array, v: Float64Array, d: number): number {
  const { phases } = unitaryEigen(mul(adjoint(u, d), v, d), d);
  const sorted = [...phases].sort((a, b) => a - b);
  let gap = 2 * Math.PI - (sorted[d - 1]! - sorted[0]!);
  for (let k = 1; k < d; k++) gap = Math.max(gap, sorted[k]! - sorted[k - 1]!);
  const arc = 2 * Math.PI - gap;
  return arc >= Math.PI ? 1 : Math.sin(arc / 2);
}
