/**
 * Measures which inputs of a unitary influence which outputs, and how strongly.
 *
 * Shape: u is 2^n x 2^n, planar; a table has entry [output * n + input].
 * Convention: with P' = u^dag P u for a Pauli P on the output and s_P^2 = ||P' - Tr_j P' x 1_j/2||_F^2 / 2^n,
 *   kept     = (1/8) sum_P s_P^2 : every circuit in which this output leaves before this input enters has a
 *              process infidelity of at least this;
 *   measured = s_Z / 2 : the probability of the output's bit is off by at least this for some input.
 * Source: factorisation and Pauli criterion, Schumacher, Westmoreland, Quantum Inf. Process. 4, 13 (2005); the
 * bound: the four Paulis twirl W = u v^dag over the output wire, so sum_P ||u^dag P u - v^dag P v||^2 = 8d -
 * 4 ||Tr_i W||^2 with ||Tr_i W||^2 >= |Tr W|^2 / (d/2); and v^dag P v is trivial on the input.
 * Method: split the rows of u by the output's bit into A (0) and B (1). Then X', Y' are made of K = A^dag B and
 * Z' = 1 - 2 B^dag B, and sum_P s_P^2 = 4 (N(K) + N(B^dag B)) / d, N(M) = the squared norm of the part of M
 * that acts on wire j = ||M01||^2 + ||M10||^2 + ||M00 - M11||^2 / 2 in blocks of that wire: no cancellation.
 * Cost: one and a half (2^n x 2^(n-1) x 2^n) complex products per output, 6 n 8^n flops in all; 4^(n-m) times
 * less for an output that only m inputs reach.
 * Limits: `INFLUENCE_WIRES_MAX` wires.
 */
import { inputsOf, type Relation } from './relation.ts';

/** 10 wires: about 65 Gflop and 70 MB. */
export const INFLUENCE_WIRES_MAX = 10;

export type InfluenceTables = { kept: Float64Array; measured: Float64Array };

/**
 * Below this a `kept` entry is rounding: entries of u that are off by 1e-12 each leave about 2^n 1e-24, and a
 * unitary written with 16 digits far less. For `measured` the threshold is the square root.
 */
export function influenceFloor(n: number): number {
  return 2 ** n * 1e-23;
}

/**
 * `reach`: inputs that can influence each output at all (light cones). The others are left out of the
 * products: what is pulled back is trivial there, so the columns with these inputs at 0 tell everything.
 */
export function influenceTables(u: Float64Array, n: number, reach?: Relation): InfluenceTables {
  const kept = new Float64Array(n * n);
  const measured = new Float64Array(n * n);
  for (let output = 0; output < n; output++) {
    const inputs = reach ? inputsOf(reach, output) : Array.from({ length: n }, (_, k) => k);
    const m = inputs.length;
    const d = 2 ** m;
    const half = 2 ** (n - 1);
    const a = columnsWhere(u, n, output, 0, inputs);
    const b = columnsWhere(u, n, output, 1, inputs);
    const k = dots(a, b, d, half, false);
    const flips = inputs.map((_, place) => partOn(k, m, place));
    const z = dots(b, b, d, half, true);
    inputs.forEach((input, place) => {
      const signs = partOn(z, m, place);
      kept[output * n + input] = (flips[place]! + signs) / (2 * d);
      measured[output * n + input] = Math.sqrt(signs / d);
    });
  }
  return { kept, measured };
}

/**
 * out[c] = the c-th column of u among those with all inputs but the given ones at 0, only the rows in which
 * the output's bit has the given value: 2^m x 2^(n-1), planar.
 */
function columnsWhere(
  u: Float64Array,
  n: number,
  output: number,
  value: 0 | 1,
  inputs: readonly number[],
): Float64Array {
  const d = 2 ** n;
  const half = d / 2;
  const columns = new Int32Array(2 ** inputs.length);
  inputs.forEach((input, place) => {
    const bit = 2 ** (inputs.length - 1 - place);
    for (let c = 0; c < columns.length; c++) if (c & bit) columns[c]! += 2 ** (n - 1 - input);
  });
  const stride = 2 ** (n - 1 - output);
  const im = columns.length * half;
  const out = new Float64Array(2 * im);
  let to = 0;
  for (let row = 0; row < d; row++) {
    if ((row & stride ? 1 : 0) !== value) continue;
    for (let c = 0; c < columns.length; c++) {
      const from = row * d + columns[c]!;
      out[c * half + to] = u[from]!;
      out[im + c * half + to] = u[d * d + from]!;
    }
    to++;
  }
  return out;
}

/**
 * out[i d + j] = sum_r conj(a[i, r]) b[j, r] for planar a, b of d x m, two rows of each at a time (in
 * registers);
 * `hermitian`: a = b, and half of it is copied. d is even.
 */
function dots(
  a: Float64Array,
  b: Float64Array,
  d: number,
  m: number,
  hermitian: boolean,
): Float64Array {
  const out = new Float64Array(2 * d * d);
  const im = d * m;
  const io = d * d;
  for (let i = 0; i < d; i += 2) {
    const p = i * m;
    for (let j = hermitian ? i : 0; j < d; j += 2) {
      const q = j * m;
      let [c0, s0, c1, s1, c2, s2, c3, s3] = [0, 0, 0, 0, 0, 0, 0, 0];
      for (let r = 0; r < m; r++) {
        const ar = a[p + r]!;
        const ai = a[im + p + r]!;
        const er = a[p + m + r]!;
        const ei = a[im + p + m + r]!;
        const br = b[q + r]!;
        const bi = b[im + q + r]!;
        const fr = b[q + m + r]!;
        const fi = b[im + q + m + r]!;
        c0 += ar * br + ai * bi;
        s0 += ar * bi - ai * br;
        c1 += ar * fr + ai * fi;
        s1 += ar * fi - ai * fr;
        c2 += er * br + ei * bi;
        s2 += er * bi - ei * br;
        c3 += er * fr + ei * fi;
        s3 += er * fi - ei * fr;
      }
      const at = i * d + j;
      out[at] = c0;
      out[io + at] = s0;
      out[at + 1] = c1;
      out[io + at + 1] = s1;
      out[at + d] = c2;
      out[io + at + d] = s2;
      out[at + d + 1] = c3;
      out[io + at + d + 1] = s3;
    }
  }
  if (!hermitian) return out;
  for (let i = 0; i < d; i++) {
    for (let j = 0; j < i; j++) {
      out[i * d + j] = out[j * d + i]!;
      out[io + i * d + j] = -out[io + j * d + i]!;
    }
  }
  return out;
}

/** Squared norm of the part of a 2^n x 2^n matrix that is not trivial on wire j. */
function partOn(m: Float64Array, n: number, j: number): number {
  const d = 2 ** n;
  const s = 2 ** (n - 1 - j);
  let off = 0;
  let difference = 0;
  for (const base of [0, d * d]) {
    for (let row = 0; row < d; row++) {
      if (row & s) continue;
      const p = base + row * d;
      const q = p + s * d;
      for (let block = 0; block < d; block += 2 * s) {
        for (let column = block; column < block + s; column++) {
          const x = m[p + column]! - m[q + column + s]!;
          off += m[p + column + s]! ** 2 + m[q + column]! ** 2;
          difference += x * x;
        }
      }
    }
  }
  return off + difference / 2;
}
