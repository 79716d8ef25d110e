/**
 * Diagonalises Hermitian matrices, one or several commuting ones at once.
 *
 * Shape: each matrix is n x n, row-major, planar. `values[k]` holds the n diagonal entries of matrix k,
 * `vectors` the n x n unitary whose columns are the common eigenvectors: A_k = V diag(values[k]) V^dag.
 * Convention: for a single matrix the values ascend; for several, the order is by the values of the first,
 * then the second, where they differ by more than rounding.
 * Method: Jacobi rotations that minimise the joint off-diagonal norm (Bunse-Gerstner, Byers, Mehrmann, SIAM
 * J. Matrix Anal. Appl. 14, 927 (1993); angles in closed form: Cardoso, Souloumiac, ibid. 17, 161 (1996)).
 * It needs no care for repeated eigenvalues: where one matrix is degenerate the others decide.
 * Cost: about 30 n^3 flops per matrix and sweep, 5 to 10 sweeps; meant for n <= 64.
 * Fails: never; for matrices that do not commute the off-diagonal rest is returned as `rest`.
 */
import { adjoint, identity, mul } from './complex-matrix.ts';

const SWEEPS_MAX = 60;

export type JointEigen = {
  values: Float64Array[];
  vectors: Float64Array;
  /** Frobenius norm of everything off the diagonals that is left. */
  rest: number;
};

/** Eigenvalues (ascending) and orthonormal eigenvectors (columns) of one Hermitian n x n matrix. */
export function hermitianEigen(
  a: Float64Array,
  n: number,
): { values: Float64Array; vectors: Float64Array } {
  const { values, vectors } = jointEigen([a], n);
  return { values: values[0]!, vectors };
}

/** Diagonalises commuting Hermitian matrices by one unitary. */
export function jointEigen(matrices: readonly Float64Array[], n: number): JointEigen {
  const work = matrices.map((a) => a.slice());
  const v = identity(n);
  const scale = Math.sqrt(work.reduce((sum, a) => sum + squares(a), 0));
  const tiny = 1e-17 * scale;
  for (let sweep = 0; sweep < SWEEPS_MAX; sweep++) {
    let turned = false;
    for (let p = 0; p < n - 1; p++) {
      for (let q = p + 1; q < n; q++) {
        if (rotatePair(work, v, n, p, q, tiny)) turned = true;
      }
    }
    if (!turned) break;
  }
  return sorted(work, v, n, scale);
}

function squares(a: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * a[i]!;
  return sum;
}

/** One Jacobi rotation of columns and rows p, q; false when nothing is left to do there. */
function rotatePair(
  work: readonly Float64Array[],
  v: Float64Array,
  n: number,
  p: number,
  q: number,
  tiny: number,
): boolean {
  const im = n * n;
  // G = sum over matrices of h h^T with h = (a_pp - a_qq, 2 Re a_pq, 2 Im a_pq), real for Hermitian matrices
  let [g00, g01, g02, g11, g12, g22] = [0, 0, 0, 0, 0, 0];
  let off = 0;
  for (const a of work) {
    const x = a[p * n + p]! - a[q * n + q]!;
    const y = 2 * a[p * n + q]!;
    const z = 2 * a[im + p * n + q]!;
    off += y * y + z * z;
    g00 += x * x;
    g01 += x * y;
    g02 += x * z;
    g11 += y * y;
    g12 += y * z;
    g22 += z * z;
  }
  if (Math.sqrt(off) <= 2 * tiny) return false;
  const axis = leadingVector(g00, g01, g02, g11, g12, g22);
  // turn the axis so that x >= 0; the rotation is then the smaller one
  const sign = axis[0] < 0 ? -1 : 1;
  const [x, y, z] = [sign * axis[0], sign * axis[1], sign * axis[2]];
  const c = Math.sqrt((x + 1) / 2);
  const sr = y / (2 * c);
  const si = z / (2 * c);
  if (Math.hypot(sr, si) < 1e-17) return false;
  // new columns: e_p' = c e_p + conj(s) e_q, e_q' = -s e_p + c e_q with s = sr + i si
  for (const a of work) {
    turnColumns(a, n, p, q, c, sr, si);
    turnRows(a, n, p, q, c, sr, si);
    a[im + p * n + p] = 0;
    a[im + q * n + q] = 0;
  }
  turnColumns(v, n, p, q, c, sr, si);
  return true;
}

function turnColumns(
  a: Float64Array,
  n: number,
  p: number,
  q: number,
  c: number,
  sr: number,
  si: number,
): void {
  const im = n * n;
  for (let i = 0; i < n; i++) {
    const xr = a[i * n + p]!;
    const xi = a[im + i * n + p]!;
    const yr = a[i * n + q]!;
    const yi = a[im + i * n + q]!;
    a[i * n + p] = c * xr + sr * yr + si * yi;
    a[im + i * n + p] = c * xi + sr * yi - si * yr;
    a[i * n + q] = c * yr - sr * xr + si * xi;
    a[im + i * n + q] = c * yi - sr * xi - si * xr;
  }
}

function turnRows(
  a: Float64Array,
  n: number,
  p: number,
  q: number,
  c: number,
  sr: number,
  si: number,
): void {
  const im = n * n;
  for (let j = 0; j < n; j++) {
    const xr = a[p * n + j]!;
    const xi = a[im + p * n + j]!;
    const yr = a[q * n + j]!;
    const yi = a[im + q * n + j]!;
    a[p * n + j] = c * xr + sr * yr - si * yi;
    a[im + p * n + j] = c * xi + sr * yi + si * yr;
    a[q * n + j] = c * yr - sr * xr - si * xi;
    a[im + q * n + j] = c * yi - sr * xi + si * xr;
  }
}

/** Unit eigenvector of the largest eigenvalue of a symmetric positive semidefinite 3 x 3 matrix. */
function leadingVector(
  g00: number,
  g01: number,
  g02: number,
  g11: number,
  g12: number,
  g22: number,
): [number, number, number] {
  const g = [g00, g01, g02, g01, g11, g12, g02, g12, g22];
  const v = [1, 0, 0, 0, 1, 0, 0, 0, 1];
  const pairs = [
    [0, 1],
    [0, 2],
    [1, 2],
  ] as const;
  for (let sweep = 0; sweep < 12; sweep++) {
    let turned = false;
    for (const [p, q] of pairs) {
      const apq = g[3 * p + q]!;
      if (Math.abs(apq) <= 1e-18 * (Math.abs(g[4 * p]!) + Math.abs(g[4 * q]!))) continue;
      turned = true;
      const theta = (g[4 * q]! - g[4 * p]!) / (2 * apq);
      const t = (theta >= 0 ? 1 : -1) / (Math.abs(theta) + Math.hypot(theta, 1));
      const c = 1 / Math.hypot(t, 1);
      const s = t * c;
      for (let k = 0; k < 3; k++) {
        const [x, y] = [g[3 * k + p]!, g[3 * k + q]!];
        g[3 * k + p] = c * x - s * y;
        g[3 * k + q] = s * x + c * y;
      }
      for (let k = 0; k < 3; k++) {
        const [x, y] = [g[3 * p + k]!, g[3 * q + k]!];
        g[3 * p + k] = c * x - s * y;
        g[3 * q + k] = s * x + c * y;
        const [w, z] = [v[3 * k + p]!, v[3 * k + q]!];
        v[3 * k + p] = c * w - s * z;
        v[3 * k + q] = s * w + c * z;
      }
    }
    if (!turned) break;
  }
  const top = g[0]! >= g[4]! && g[0]! >= g[8]! ? 0 : g[4]! >= g[8]! ? 1 : 2;
  const [x, y, z] = [v[top]!, v[3 + top]!, v[6 + top]!];
  const norm = Math.hypot(x, y, z);
  return [x / norm, y / norm, z / norm];
}

function sorted(work: Float64Array[], v: Float64Array, n: number, scale: number): JointEigen {
  const near = 1e-9 * (scale || 1);
  const order = Array.from({ length: n }, (_, k) => k).sort((i, j) => {
    for (const a of work) {
      const difference = a[i * n + i]! - a[j * n + j]!;
      if (work.length === 1 || Math.abs(difference) > near) return difference;
    }
    return i - j;
  });
  const values = work.map((a) => Float64Array.from(order, (k) => a[k * n + k]!));
  const vectors = new Float64Array(2 * n * n);
  order.forEach((from, to) => {
    for (let i = 0; i < n; i++) {
      vectors[i * n + to] = v[i * n + from]!;
      vectors[n * n + i * n + to] = v[n * n + i * n + from]!;
    }
  });
  let rest = 0;
  for (const a of work) {
    rest += squares(a);
    for (let i = 0; i < n; i++) rest -= a[i * n + i]! ** 2;
  }
  return { values, vectors, rest: Math.sqrt(Math.max(0, rest)) };
}

/** V diag(values) V^dag for complex diagonal values given as two arrays. */
export function fromEigen(
  vectors: Float64Array,
  re: Float64Array,
  im: Float64Array,
  n: number,
): Float64Array {
  const scaled = new Float64Array(2 * n * n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      const x = vectors[i * n + j]!;
      const y = vectors[n * n + i * n + j]!;
      scaled[i * n + j] = x * re[j]! - y * im[j]!;
      scaled[n * n + i * n + j] = x * im[j]! + y * re[j]!;
    }
  }
  return mul(scaled, adjoint(vectors, n), n);
}
