/**
 * The inner loops of the fits in plain TypeScript: the twin of the compiled module, used where WebAssembly SIMD is missing.
 *
 * Shape: planar row-major blocks, as everywhere; `gram` and `cholesky` are real and fill the lower triangle only.
 * Method: sums over the second index of two real rows run over even and odd terms apart and add the two at the end, as a
 * vector of two lanes does, so both twins return the same bytes.
 * Cost: gram p^2 m / 2, multiply 4 m k n, square 2 d^2 rows, cholesky p^3 / 6 multiply-adds.
 */
import { evolveInto, gapOf, jacobianInto, rowsInto, type Sweep, slopeInto } from './plain-sweep.ts';

export type Kernels = {
  /** Lower triangle of out = j j^T for the real p x m matrix j. */
  gramInto(out: Float64Array, j: Float64Array, p: number, m: number): void;
  /** out = a b for complex a of m x k, b of k x n. */
  multiplyInto(
    out: Float64Array,
    a: Float64Array,
    b: Float64Array,
    m: number,
    k: number,
    n: number,
  ): void;
  /** out = 2 b^dag b - 1 for complex b of rows x d. */
  squareInto(out: Float64Array, b: Float64Array, rows: number, d: number): void;
  /** Lower Cholesky factor l of a + diag(shift); false when that is not positive definite. */
  choleskyInto(l: Float64Array, a: Float64Array, shift: Float64Array, p: number): boolean;
  /** x with (a + diag(shift)) x = b, overwriting b; false as for `choleskyInto`, with b as it was. */
  solveInto(b: Float64Array, a: Float64Array, shift: Float64Array, p: number): boolean;
  /** x = the product of the steps. */
  evolveInto(x: Float64Array, sweep: Sweep, turns: Float64Array): Float64Array;
  /** The same, and for every angle the packed P'/2 (plain-sweep.ts) as a row of d^2 numbers. */
  rowsInto(rows: Float64Array, x: Float64Array, sweep: Sweep, turns: Float64Array): Float64Array;
  /** |target - e^{-i phi} V|^2 / 2, V the product of the steps. */
  gapOf(sweep: Sweep, turns: Float64Array, target: Float64Array): number;
  /** The same, with its gradient. */
  slopeInto(
    gradient: Float64Array,
    sweep: Sweep,
    turns: Float64Array,
    target: Float64Array,
  ): number;
  /** The same, with gradient and lower triangle of the Gauss-Newton matrix. */
  lineariseInto(
    normal: Float64Array,
    gradient: Float64Array,
    sweep: Sweep,
    turns: Float64Array,
    target: Float64Array,
  ): number;
};

export const plainKernels: Kernels = Object.freeze({
  gramInto,
  multiplyInto,
  squareInto,
  choleskyInto,
  solveInto,
  evolveInto,
  rowsInto,
  gapOf,
  slopeInto,
  lineariseInto,
});

function lineariseInto(
  normal: Float64Array,
  gradient: Float64Array,
  sweep: Sweep,
  turns: Float64Array,
  target: Float64Array,
): number {
  const width = sweep.d * sweep.d;
  const rows = new Float64Array(sweep.angles * width);
  const value = jacobianInto(rows, gradient, sweep, turns, target);
  gramInto(normal, rows, sweep.angles, width);
  return value;
}

function solveInto(b: Float64Array, a: Float64Array, shift: Float64Array, p: number): boolean {
  const l = new Float64Array(p * p);
  if (!choleskyInto(l, a, shift, p)) return false;
  for (let r = 0; r < p; r++) {
    let [x, xOdd] = [0, 0];
    for (let k = 0; k + 1 < r; k += 2) {
      x += l[r * p + k]! * b[k]!;
      xOdd += l[r * p + k + 1]! * b[k + 1]!;
    }
    let rest = b[r]! - (x + xOdd);
    if (r % 2 === 1) rest -= l[r * p + r - 1]! * b[r - 1]!;
    b[r] = rest / l[r * p + r]!;
  }
  for (let r = p - 1; r >= 0; r--) {
    const value = b[r]! / l[r * p + r]!;
    b[r] = value;
    for (let k = 0; k < r; k++) b[k]! -= value * l[r * p + k]!;
  }
  return true;
}

function gramInto(out: Float64Array, j: Float64Array, p: number, m: number): void {
  for (let r = 0; r < p; r += 2) {
    const hasSecond = r + 1 < p;
    const a = r * m;
    const b = hasSecond ? a + m : a;
    for (let s = 0; s <= r + 1 && s < p; s += 2) {
      const hasOther = s + 1 < p;
      const e = s * m;
      const f = hasOther ? e + m : e;
      let [ae, af, be, bf] = [0, 0, 0, 0];
      let [aeOdd, afOdd, beOdd, bfOdd] = [0, 0, 0, 0];
      for (let k = 0; k < m; k += 2) {
        let x = j[a + k]!;
        let y = j[b + k]!;
        let u = j[e + k]!;
        let v = j[f + k]!;
        ae += x * u;
        af += x * v;
        be += y * u;
        bf += y * v;
        if (k + 1 === m) break;
        x = j[a + k + 1]!;
        y = j[b + k + 1]!;
        u = j[e + k + 1]!;
        v = j[f + k + 1]!;
        aeOdd += x * u;
        afOdd += x * v;
        beOdd += y * u;
        bfOdd += y * v;
      }
      out[r * p + s] = ae + aeOdd;
      // the entry above the diagonal stays as it is
      if (hasOther && s < r) out[r * p + s + 1] = af + afOdd;
      if (hasSecond) {
        out[(r + 1) * p + s] = be + beOdd;
        if (hasOther) out[(r + 1) * p + s + 1] = bf + bfOdd;
      }
    }
  }
}

function multiplyInto(
  out: Float64Array,
  a: Float64Array,
  b: Float64Array,
  m: number,
  k: number,
  n: number,
): void {
  const [ia, ib, io] = [m * k, k * n, m * n];
  out.fill(0, 0, 2 * io);
  for (let i = 0; i < m; i++) {
    for (let l = 0; l < k; l++) {
      const ar = a[i * k + l]!;
      const ai = a[ia + i * k + l]!;
      const rowB = l * n;
      const rowO = i * n;
      for (let j = 0; j < n; j++) {
        const br = b[rowB + j]!;
        const bi = b[ib + rowB + j]!;
        out[rowO + j]! += ar * br - ai * bi;
        out[io + rowO + j]! += ar * bi + ai * br;
      }
    }
  }
}

function squareInto(out: Float64Array, b: Float64Array, rows: number, d: number): void {
  const im = d * d;
  const half = rows * d;
  out.fill(0, 0, 2 * im);
  for (let r = 0; r < half; r += d) {
    for (let i = 0; i < d; i++) {
      const br = 2 * b[r + i]!;
      const bi = 2 * b[half + r + i]!;
      const row = i * d;
      for (let j = i; j < d; j++) {
        const cr = b[r + j]!;
        const ci = b[half + r + j]!;
        out[row + j]! += br * cr + bi * ci;
        out[im + row + j]! += br * ci - bi * cr;
      }
    }
  }
  for (let i = 0; i < d; i++) {
    out[i * d + i]! -= 1;
    out[im + i * d + i] = 0;
    for (let j = i + 1; j < d; j++) {
      out[j * d + i] = out[i * d + j]!;
      out[im + j * d + i] = -out[im + i * d + j]!;
    }
  }
}

function choleskyInto(l: Float64Array, a: Float64Array, shift: Float64Array, p: number): boolean {
  for (let r = 0; r < p; r++) {
    const rowR = r * p;
    // two columns at a time share the loads of row r
    for (let s = 0; s < r; s += 2) {
      const [rowS, rowT] = [s * p, s * p + p];
      let [x, xOdd, y, yOdd] = [0, 0, 0, 0];
      for (let k = 0; k < s; k += 2) {
        const [even, odd] = [l[rowR + k]!, l[rowR + k + 1]!];
        x += even * l[rowS + k]!;
        xOdd += odd * l[rowS + k + 1]!;
        y += even * l[rowT + k]!;
        yOdd += odd * l[rowT + k + 1]!;
      }
      const first = (a[rowR + s]! - (x + xOdd)) / l[rowS + s]!;
      l[rowR + s] = first;
      if (s + 1 < r) {
        const other = a[rowR + s + 1]! - (y + yOdd) - first * l[rowT + s]!;
        l[rowR + s + 1] = other / l[rowT + s + 1]!;
      }
    }
    let [x, xOdd] = [0, 0];
    for (let k = 0; k + 1 < r; k += 2) {
      x += l[rowR + k]! * l[rowR + k]!;
      xOdd += l[rowR + k + 1]! * l[rowR + k + 1]!;
    }
    let rest = a[rowR + r]! + shift[r]! - (x + xOdd);
    if (r % 2 === 1) rest -= l[rowR + r - 1]! * l[rowR + r - 1]!;
    if (!(rest > 0)) return false;
    l[rowR + r] = Math.sqrt(rest);
  }
  return true;
}
