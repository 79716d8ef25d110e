/**
 * Singular values, polar factors and random unitaries of complex matrices.
 *
 * Shape: a is m x n with m >= n, row-major, planar. Result a = U diag(s) V^dag with U m x n, V n x n.
 * Convention: singular values descend and are >= 0.
 * Method: one-sided Jacobi (Hestenes, J. SIAM 6, 51 (1958); Demmel, Veselic, SIAM J. Matrix Anal. Appl. 13,
 * 1204 (1992)): columns are rotated until orthogonal, which is accurate even for tiny singular values.
 * Rank-deficient matrices: columns of U that belong to zero singular values are filled up by orthonormal ones.
 * Cost: about 16 m n^2 flops a sweep, 5 to 10 sweeps.
 */
import { adjoint, identity, mul } from './complex-matrix.ts';
import { normal, type Random } from './random.ts';

const SWEEPS_MAX = 60;
/** Products of columns below this underflow: their phase is noise, and a rotation by it would be no rotation. */
const PRODUCT_LEAST = 1e-290;

export type Svd = { u: Float64Array; s: Float64Array; v: Float64Array };

export function svd(a: Float64Array, m: number, n = m): Svd {
  if (m < n) {
    const { u, s, v } = svd(adjoint(a, m, n), n, m);
    return { u: v, s, v: u };
  }
  // columns of a, and of v, as rows of the transposed copies: contiguous in memory
  const w = transposed(a, m, n);
  const v = transposed(identity(n), n, n);
  for (let sweep = 0; sweep < SWEEPS_MAX; sweep++) {
    let turned = false;
    for (let p = 0; p < n - 1; p++) {
      for (let q = p + 1; q < n; q++) if (orthogonalise(w, v, m, n, p, q)) turned = true;
    }
    if (!turned) break;
  }
  const norms = Array.from({ length: n }, (_, j) => rowNorm(w, m, n, j));
  const order = norms.map((_, j) => j).sort((i, j) => norms[j]! - norms[i]! || i - j);
  const s = Float64Array.from(order, (j) => norms[j]!);
  const u = new Float64Array(2 * m * n);
  const vOut = new Float64Array(2 * n * n);
  order.forEach((from, to) => {
    for (let i = 0; i < m; i++) {
      const scale = norms[from]! > 0 ? 1 / norms[from]! : 0;
      u[i * n + to] = w[from * m + i]! * scale;
      u[m * n + i * n + to] = w[n * m + from * m + i]! * scale;
    }
    for (let i = 0; i < n; i++) {
      vOut[i * n + to] = v[from * n + i]!;
      vOut[n * n + i * n + to] = v[n * n + from * n + i]!;
    }
  });
  const rank = s.findIndex((x) => x <= 1e-15 * m * s[0]!);
  if (rank >= 0) completeColumns(u, m, n, rank);
  return { u, s, v: vOut };
}

function transposed(a: Float64Array, m: number, n: number): Float64Array {
  const out = new Float64Array(2 * m * n);
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < n; j++) {
      out[j * m + i] = a[i * n + j]!;
      out[m * n + j * m + i] = a[m * n + i * n + j]!;
    }
  }
  return out;
}

function rowNorm(w: Float64Array, m: number, n: number, j: number): number {
  let sum = 0;
  for (let i = 0; i < m; i++) sum += w[j * m + i]! ** 2 + w[n * m + j * m + i]! ** 2;
  return Math.sqrt(sum);
}

function orthogonalise(
  w: Float64Array,
  v: Float64Array,
  m: number,
  n: number,
  p: number,
  q: number,
): boolean {
  const im = n * m;
  let [pp, qq, re, imag] = [0, 0, 0, 0];
  for (let i = 0; i < m; i++) {
    const [a, b] = [w[p * m + i]!, w[im + p * m + i]!];
    const [c, d] = [w[q * m + i]!, w[im + q * m + i]!];
    pp += a * a + b * b;
    qq += c * c + d * d;
    re += a * c + b * d;
    imag += a * d - b * c;
  }
  const size = Math.hypot(re, imag);
  if (size < PRODUCT_LEAST || size <= 1e-16 * Math.sqrt(pp * qq)) return false;
  // phase of <p, q> removed, then the real rotation that makes both orthogonal
  const [cr, ci] = [re / size, imag / size];
  const theta = (qq - pp) / (2 * size);
  const t = (theta >= 0 ? 1 : -1) / (Math.abs(theta) + Math.hypot(theta, 1));
  const c = 1 / Math.hypot(t, 1);
  turnRowsOf(w, im, m, p, q, c, t * c, cr, ci);
  turnRowsOf(v, n * n, n, p, q, c, t * c, cr, ci);
  return true;
}

function turnRowsOf(
  w: Float64Array,
  im: number,
  length: number,
  p: number,
  q: number,
  c: number,
  s: number,
  cr: number,
  ci: number,
): void {
  for (let i = 0; i < length; i++) {
    const xr = w[p * length + i]!;
    const xi = w[im + p * length + i]!;
    const zr = w[q * length + i]!;
    const zi = w[im + q * length + i]!;
    // y = e^{-i arg} z
    const yr = cr * zr + ci * zi;
    const yi = cr * zi - ci * zr;
    w[p * length + i] = c * xr - s * yr;
    w[im + p * length + i] = c * xi - s * yi;
    w[q * length + i] = s * xr + c * yr;
    w[im + q * length + i] = s * xi + c * yi;
  }
}

/** Replaces columns from..n-1 of the m x n matrix u by vectors orthonormal to all before (Gram-Schmidt twice). */
export function completeColumns(u: Float64Array, m: number, n: number, from: number): void {
  const im = m * n;
  let candidate = 0;
  for (let j = from; j < n; j++) {
    for (; ; candidate++) {
      for (let i = 0; i < m; i++) {
        u[i * n + j] = i === candidate % m ? 1 : 0;
        u[im + i * n + j] = 0;
      }
      for (let round = 0; round < 2; round++)
        for (let k = 0; k < j; k++) removeColumn(u, m, n, k, j);
      let sum = 0;
      for (let i = 0; i < m; i++) sum += u[i * n + j]! ** 2 + u[im + i * n + j]! ** 2;
      if (sum < 0.25 / m) continue;
      const scale = 1 / Math.sqrt(sum);
      for (let i = 0; i < m; i++) {
        u[i * n + j]! *= scale;
        u[im + i * n + j]! *= scale;
      }
      for (let k = 0; k < j; k++) removeColumn(u, m, n, k, j);
      candidate++;
      break;
    }
  }
}

/** Takes out of column j its part along column k, which has length 1; u is m x n, planar. */
export function removeColumn(u: Float64Array, m: number, n: number, k: number, j: number): void {
  const im = m * n;
  let [re, imag] = [0, 0];
  for (let i = 0; i < m; i++) {
    const [a, b] = [u[i * n + k]!, u[im + i * n + k]!];
    const [c, d] = [u[i * n + j]!, u[im + i * n + j]!];
    re += a * c + b * d;
    imag += a * d - b * c;
  }
  for (let i = 0; i < m; i++) {
    const [a, b] = [u[i * n + k]!, u[im + i * n + k]!];
    u[i * n + j]! -= a * re - b * imag;
    u[im + i * n + j]! -= a * imag + b * re;
  }
}

/** The unitary polar factor of a square matrix: the unitary nearest to it in every unitarily invariant norm. */
export function polarFactor(a: Float64Array, n: number): Float64Array {
  const { u, v } = svd(a, n);
  return mul(u, adjoint(v, n), n);
}

/**
 * A unitary drawn from the Haar measure: orthonormalised columns of a Gaussian matrix, whose triangular factor
 * then has a positive diagonal (Mezzadri, Notices AMS 54, 592 (2007)).
 */
export function haarUnitary(n: number, draw: Random): Float64Array {
  const u = Float64Array.from({ length: 2 * n * n }, () => normal(draw));
  const im = n * n;
  for (let j = 0; j < n; j++) {
    for (let round = 0; round < 2; round++) for (let k = 0; k < j; k++) removeColumn(u, n, n, k, j);
    let sum = 0;
    for (let i = 0; i < n; i++) sum += u[i * n + j]! ** 2 + u[im + i * n + j]! ** 2;
    const scale = 1 / Math.sqrt(sum);
    for (let i = 0; i < n; i++) {
      u[i * n + j]! *= scale;
      u[im + i * n + j]! *= scale;
    }
  }
  return u;
}
