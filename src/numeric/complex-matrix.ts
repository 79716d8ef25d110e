/**
 * Elementary operations on complex matrices.
 *
 * Shape: an m x n complex matrix is one Float64Array of length 2mn, row-major and planar: all real parts
 * first, then all imaginary parts. Entry (i, j) is a[i n + j] + i a[mn + i n + j].
 * Convention: functions named `...Into` write to `out`, which they return; `out` must not alias an input
 * unless the comment says so. Functions without `Into` allocate and are meant for code outside hot loops.
 * Cost: products 8mnk flops, the rest linear in the number of entries.
 */
import { kernels } from './kernels/kernels.ts';

/** Multiply-adds from which the compiled product pays for copying its operands. */
const KERNEL_WORK = 512;

/** The n x n identity. */
export function identity(n: number): Float64Array {
  const out = new Float64Array(2 * n * n);
  for (let i = 0; i < n; i++) out[i * n + i] = 1;
  return out;
}

/** out = a b for a of m x k, b of k x n. */
export function mulInto(
  out: Float64Array,
  a: Float64Array,
  b: Float64Array,
  m: number,
  k: number,
  n: number,
): Float64Array {
  if (m * k * n >= KERNEL_WORK) {
    kernels.multiplyInto(out, a, b, m, k, n);
    return out;
  }
  out.fill(0, 0, 2 * m * n);
  const ia = m * k;
  const ib = k * n;
  const io = m * n;
  for (let i = 0; i < m; i++) {
    for (let l = 0; l < k; l++) {
      const ar = a[i * k + l]!;
      const ai = a[ia + i * k + l]!;
      if (ar === 0 && ai === 0) continue;
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
  return out;
}

/** a b for a of m x k and b of k x n (square by default). */
export function mul(a: Float64Array, b: Float64Array, m: number, k = m, n = m): Float64Array {
  return mulInto(new Float64Array(2 * m * n), a, b, m, k, n);
}

/** The conjugate transpose of an m x n matrix: n x m. */
export function adjoint(a: Float64Array, m: number, n = m): Float64Array {
  const out = new Float64Array(2 * m * n);
  const im = m * n;
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < n; j++) {
      out[j * m + i] = a[i * n + j]!;
      out[im + j * m + i] = -a[im + i * n + j]!;
    }
  }
  return out;
}

/** Kronecker product of an m x n with a p x q matrix: mp x nq; the left factor is more significant. */
export function kron(
  a: Float64Array,
  b: Float64Array,
  m: number,
  p: number,
  n = m,
  q = p,
): Float64Array {
  const rows = m * p;
  const columns = n * q;
  const out = new Float64Array(2 * rows * columns);
  const [ia, ib, io] = [m * n, p * q, rows * columns];
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < n; j++) {
      const ar = a[i * n + j]!;
      const ai = a[ia + i * n + j]!;
      for (let k = 0; k < p; k++) {
        for (let l = 0; l < q; l++) {
          const br = b[k * q + l]!;
          const bi = b[ib + k * q + l]!;
          const at = (i * p + k) * columns + j * q + l;
          out[at] = ar * br - ai * bi;
          out[io + at] = ar * bi + ai * br;
        }
      }
    }
  }
  return out;
}

/** Tr(a^dag b) for two arrays of the same shape, as [re, im]. */
export function innerProduct(a: Float64Array, b: Float64Array): [number, number] {
  const half = a.length / 2;
  let re = 0;
  let im = 0;
  for (let i = 0; i < half; i++) {
    const [ar, ai, br, bi] = [a[i]!, a[half + i]!, b[i]!, b[half + i]!];
    re += ar * br + ai * bi;
    im += ar * bi - ai * br;
  }
  return [re, im];
}

/** The square of the Frobenius norm. */
export function normSquared(a: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * a[i]!;
  return sum;
}

/** max |(a^dag a - 1)_ij|: how far the n x n matrix is from unitary; NaN when an entry is not finite. */
export function unitarityError(a: Float64Array, n: number): number {
  const product = mul(adjoint(a, n), a, n);
  let worst = 0;
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      const re = product[i * n + j]! - (i === j ? 1 : 0);
      const im = product[n * n + i * n + j]!;
      const size = Math.hypot(re, im);
      if (!(size <= worst)) worst = size;
    }
  }
  return worst;
}

/** Builds a matrix from rows of entries, each a real number or a pair [re, im]. */
export function fromRows(
  rows: readonly (readonly (number | readonly [number, number])[])[],
): Float64Array {
  const m = rows.length;
  const n = rows[0]?.length ?? 0;
  const out = new Float64Array(2 * m * n);
  rows.forEach((row, i) => {
    row.forEach((entry, j) => {
      const [re, im] = typeof entry === 'number' ? [entry, 0] : entry;
      out[i * n + j] = re;
      out[m * n + i * n + j] = im;
    });
  });
  return out;
}
