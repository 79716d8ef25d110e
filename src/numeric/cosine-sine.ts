/**
 * Takes a unitary apart by the cosine-sine decomposition into equal halves.
 *
 * Shape: u is 2m x 2m, planar; all results but `angles` are m x m, planar. With c = cos(angles), s = sin(angles) as diagonals
 *   u = [l1 0; 0 l2] [c -s; s c] [r1 0; 0 r2].
 * Convention: angles ascend in [0, pi/2].
 * Method: Van Loan, Numer. Math. 46, 479 (1985), section 3, with Jacobi instead of QR steps: the singular vectors of the upper
 * left quarter make both left quarters' columns orthogonal, except for columns with cosines near 1, whose sines are
 * rounding of the cosines; those are turned once more by the singular vectors of the lower left quarter.
 * Changed: l1 and l2 come from Gram-Schmidt in order of falling length, so that short columns cost no accuracy, and
 * the rows of r2 from both right quarters at once, -s l1^dag u12 + c l2^dag u22, which needs no division.
 * Cost: two singular value decompositions and six products of size m. Fails: never for unitary input.
 */
import { adjoint, mul } from './complex-matrix.ts';
import { completeColumns, removeColumn, svd } from './svd.ts';

export type CosineSine = {
  l1: Float64Array;
  l2: Float64Array;
  angles: Float64Array;
  r1: Float64Array;
  r2: Float64Array;
};

/** Columns shorter than this have no direction of their own. */
const LENGTH_MIN = 1e-15;

export function cosineSine(u: Float64Array, m: number): CosineSine {
  const quarter = (row: number, column: number): Float64Array => quarterOf(u, m, row, column);
  const v = svd(quarter(0, 0), m).v;
  const upper = mul(quarter(0, 0), v, m);
  // singular values descend, so the long columns come first
  const squares = columnSquares(upper, m);
  const isLong = (square: number): boolean => square >= 0.5;
  const long = squares.findIndex((square) => !isLong(square));
  const count = long < 0 ? m : long;
  if (count > 0) turnLong(v, mul(quarter(1, 0), v, m), m, count);
  const [a, c] = [mul(quarter(0, 0), v, m), mul(quarter(1, 0), v, m)];
  const order = Array.from({ length: m }, (_, k) => k);
  const cosines = orthonormalised(a, m, order);
  const sines = orthonormalised(c, m, order.slice().reverse());
  const angles = Float64Array.from(order, (k) => Math.atan2(sines[k]!, cosines[k]!));
  const fromUpper = mul(adjoint(a, m), quarter(0, 1), m);
  const fromLower = mul(adjoint(c, m), quarter(1, 1), m);
  const r2 = fromUpper.map((x, at) => {
    const angle = angles[Math.floor((at % (m * m)) / m)]!;
    return -Math.sin(angle) * x + Math.cos(angle) * fromLower[at]!;
  });
  return { l1: a, l2: c, angles, r1: adjoint(v, m), r2 };
}

function quarterOf(u: Float64Array, m: number, row: number, column: number): Float64Array {
  const out = new Float64Array(2 * m * m);
  const n = 2 * m;
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < m; j++) {
      const at = (i + row * m) * n + j + column * m;
      out[i * m + j] = u[at]!;
      out[m * m + i * m + j] = u[n * n + at]!;
    }
  }
  return out;
}

/** [[u11, u12], [u21, u22]] from four m x m quarters: 2m x 2m. */
export function fromQuarters(
  quarters: readonly [
    Float64Array | null,
    Float64Array | null,
    Float64Array | null,
    Float64Array | null,
  ],
  m: number,
): Float64Array {
  const n = 2 * m;
  const out = new Float64Array(2 * n * n);
  quarters.forEach((quarter, index) => {
    if (!quarter) return;
    const [row, column] = [index >> 1, index & 1];
    for (let i = 0; i < m; i++) {
      for (let j = 0; j < m; j++) {
        const at = (i + row * m) * n + j + column * m;
        out[at] = quarter[i * m + j]!;
        out[n * n + at] = quarter[m * m + i * m + j]!;
      }
    }
  });
  return out;
}

/** The four quarters of u in row-major order. */
export function quartersOf(
  u: Float64Array,
  m: number,
): [Float64Array, Float64Array, Float64Array, Float64Array] {
  return [
    quarterOf(u, m, 0, 0),
    quarterOf(u, m, 0, 1),
    quarterOf(u, m, 1, 0),
    quarterOf(u, m, 1, 1),
  ];
}

function columnSquares(a: Float64Array, m: number): Float64Array {
  const out = new Float64Array(m);
  for (let at = 0; at < a.length; at++) out[at % m]! += a[at]! ** 2;
  return out;
}

/** Turns the first `count` columns of v among themselves so that those of `lower` = u21 v become orthogonal. */
function turnLong(v: Float64Array, lower: Float64Array, m: number, count: number): void {
  const first = (from: Float64Array): Float64Array => {
    const out = new Float64Array(2 * m * count);
    for (let i = 0; i < m; i++) {
      for (let j = 0; j < count; j++) {
        out[i * count + j] = from[i * m + j]!;
        out[m * count + i * count + j] = from[m * m + i * m + j]!;
      }
    }
    return out;
  };
  const w = svd(first(lower), m, count).v;
  const turned = mul(first(v), w, m, count, count);
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < count; j++) {
      // the shortest sines belong to the longest cosines, which come first
      const from = i * count + (count - 1 - j);
      v[i * m + j] = turned[from]!;
      v[m * m + i * m + j] = turned[m * count + from]!;
    }
  }
}

/** Gram-Schmidt, twice, on the columns of a in this order (longest first), in place; the lengths that were left. */
function orthonormalised(a: Float64Array, m: number, order: readonly number[]): Float64Array {
  const im = m * m;
  const sorted = new Float64Array(2 * im);
  const lengths = new Float64Array(m);
  let kept = 0;
  for (const [place, column] of order.entries()) {
    for (let i = 0; i < m; i++) {
      sorted[i * m + place] = a[i * m + column]!;
      sorted[im + i * m + place] = a[im + i * m + column]!;
    }
    const length = makeOrthogonal(sorted, m, place);
    if (length < LENGTH_MIN) break;
    lengths[column] = length;
    kept = place + 1;
  }
  if (kept < m) completeColumns(sorted, m, m, kept);
  for (const [place, column] of order.entries()) {
    for (let i = 0; i < m; i++) {
      a[i * m + column] = sorted[i * m + place]!;
      a[im + i * m + column] = sorted[im + i * m + place]!;
    }
  }
  return lengths;
}

/** Makes column `place` orthogonal to those before it and of length 1; returns the length it had then. */
function makeOrthogonal(a: Float64Array, m: number, place: number): number {
  const im = m * m;
  let length = 0;
  for (let round = 0; round < 3; round++) {
    for (let k = 0; k < place; k++) removeColumn(a, m, m, k, place);
    let square = 0;
    for (let i = 0; i < m; i++) square += a[i * m + place]! ** 2 + a[im + i * m + place]! ** 2;
    const norm = Math.sqrt(square);
    if (round === 0) length = norm;
    if (norm < LENGTH_MIN) return round === 0 ? norm : 0;
    for (let i = 0; i < m; i++) {
      a[i * m + place]! /= norm;
      a[im + i * m + place]! /= norm;
    }
  }
  return length;
}
