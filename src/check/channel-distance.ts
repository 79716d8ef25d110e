/**
 * Measures how far two observed circuits are from each other.
 *
 * Quantity: with A_m, B_m the matrices of outcome m (Choi factors, see observed.ts) and d = 2^(any inputs),
 *   1 - D = (1/d) sum_m || A_m^dag B_m ||_1 ,
 * the root fidelity of the two Choi states (Uhlmann, Rep. Math. Phys. 9, 273 (1976)), outcomes being perfectly
 * distinguishable. For one outcome and nothing traced out it is |Tr(U^dag V)|/d, so D is the Hilbert-Schmidt
 * distance up to a global phase, and 1 - (1 - D)^2 the process infidelity.
 * Method: the nuclear norm is reached by the polar factor W of B_m^dag A_m, so
 *   D = (1/2d) sum_m || A_m - B_m W_m ||_F^2 ,
 * a sum of squares without cancellation, right down to 1e-30 (orthogonal Procrustes problem; Schoenemann,
 * Psychometrika 31, 1 (1966)). The phase is that of the trace when there is one outcome of one column.
 * Wide matrices (more columns than rows) are first reduced to square ones by their singular values.
 * Rounding: each entry of an amplitude carries at most about eps times the number of gates applied; the error bar
 * is the square of that, plus first-order mixing with the distance itself.
 */
import { adjoint, mul } from '../numeric/complex-matrix.ts';
import { svd } from '../numeric/svd.ts';
import type { Observed } from './observed.ts';

export type ChannelDistance = {
  hilbertSchmidt: number;
  /** rewritten = e^{i phase} original; null unless both are single operators. */
  phase: number | null;
  /** Bound on the rounding error of `hilbertSchmidt`. */
  errorBar: number;
};

const EPSILON = 2 ** -52;

export function channelDistance(
  original: Observed,
  rewritten: Observed,
  gates: number,
): ChannelDistance {
  let sum = 0;
  let norm = 0;
  let phase: number | null = null;
  const keys = [...new Set([...original.outcomes.keys(), ...rewritten.outcomes.keys()])].sort();
  for (const key of keys) {
    const a = original.outcomes.get(key);
    const b = rewritten.outcomes.get(key);
    const aNorm = a ? squares(a.matrix) : 0;
    const bNorm = b ? squares(b.matrix) : 0;
    norm += aNorm;
    if (!a || !b || aNorm === 0 || bNorm === 0) {
      sum += aNorm + bNorm;
      continue;
    }
    const rows = original.rows;
    if (a.columns === 1 && b.columns === 1) {
      const found = oneColumn(a.matrix, b.matrix);
      sum += found.gap;
      if (keys.length === 1) phase = found.phase;
    } else sum += procrustesGap(squareUp(a, rows), squareUp(b, rows), rows);
  }
  const hilbertSchmidt = sum / (2 * norm);
  const amplitude = EPSILON * Math.max(8, 4 * Math.sqrt(gates) + 8);
  const errorBar = amplitude ** 2 + 2 * amplitude * Math.sqrt(2 * hilbertSchmidt);
  return { hilbertSchmidt, phase, errorBar };
}

function squares(a: Float64Array): number {
  let sum = 0;
  for (let k = 0; k < a.length; k++) sum += a[k]! * a[k]!;
  return sum;
}

/** min over phases of || a - e^{-i phase} b ||^2. */
function oneColumn(a: Float64Array, b: Float64Array): { gap: number; phase: number } {
  const half = a.length / 2;
  let [re, im] = [0, 0];
  for (let k = 0; k < half; k++) {
    re += a[k]! * b[k]! + a[half + k]! * b[half + k]!;
    im += a[k]! * b[half + k]! - a[half + k]! * b[k]!;
  }
  const phase = Math.atan2(im, re);
  const [c, s] = [Math.cos(phase), -Math.sin(phase)];
  let gap = 0;
  for (let k = 0; k < half; k++) {
    const x = a[k]! - (c * b[k]! - s * b[half + k]!);
    const y = a[half + k]! - (c * b[half + k]! + s * b[k]!);
    gap += x * x + y * y;
  }
  return { gap, phase };
}

type Factor = { matrix: Float64Array; columns: number };

/** L with L L^dag = A A^dag and no more columns than rows. */
function squareUp({ matrix, columns }: Factor, rows: number): Factor {
  if (columns <= rows) return { matrix, columns };
  if (rows === 1) return { matrix: new Float64Array([Math.sqrt(squares(matrix)), 0]), columns: 1 };
  const { u, s } = svd(matrix, rows, columns);
  const out = u.slice();
  for (let r = 0; r < 2 * rows; r++) for (let k = 0; k < rows; k++) out[r * rows + k]! *= s[k]!;
  return { matrix: out, columns: rows };
}

/** min over partial isometries W of || A - B W ||^2, with B padded to at least as many columns as A. */
function procrustesGap(a: Factor, b: Factor, rows: number): number {
  const columns = Math.max(a.columns, b.columns);
  const [x, y] = [padded(a, rows, columns), padded(b, rows, columns)];
  const cross = mul(adjoint(y, rows, columns), x, columns, rows, columns);
  const { u, v } = svd(cross, columns);
  const w = mul(u, adjoint(v, columns), columns);
  const turned = mul(y, w, rows, columns, columns);
  let gap = 0;
  for (let k = 0; k < x.length; k++) gap += (x[k]! - turned[k]!) ** 2;
  return gap;
}

function padded({ matrix, columns }: Factor, rows: number, to: number): Float64Array {
  if (columns === to) return matrix;
  const out = new Float64Array(2 * rows * to);
  for (let r = 0; r < 2 * rows; r++) {
    for (let k = 0; k < columns; k++) out[r * to + k] = matrix[r * columns + k]!;
  }
  return out;
}
