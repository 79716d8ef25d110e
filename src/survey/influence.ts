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
 * Z' = 1 - 2 B^dag B, and sum_P s_P^2 = 4 (N(K) + N(B^dag B)) / d, N(M) = the squared norm of the part of M that
 * acts on wire j = ||M01||^2 + ||M10||^2 + ||M00 - M11||^2 / 2 in blocks of that wire: no cancellation.
 * Cost: two (2^n x 2^(n-1) x 2^n) complex products per output, 8 n 8^n flops in all.
 * Limits: `INFLUENCE_WIRES_MAX` wires.
 */
import { adjoint, mulInto } from '../numeric/complex-matrix.ts';

/** 10 wires: about 90 Gflop and 100 MB. */
export const INFLUENCE_WIRES_MAX = 10;

export type InfluenceTables = { kept: Float64Array; measured: Float64Array };

/**
 * Below this a `kept` entry is rounding: entries of u that are off by 1e-12 each leave about 2^n 1e-24, and a
 * unitary written with 16 digits far less. For `measured` the threshold is the square root.
 */
export function influenceFloor(n: number): number {
  return 2 ** n * 1e-23;
}

export function influenceTables(u: Float64Array, n: number): InfluenceTables {
  const kept = new Float64Array(n * n);
  const measured = new Float64Array(n * n);
  const d = 2 ** n;
  const half = d / 2;
  const k = new Float64Array(2 * d * d);
  for (let output = 0; output < n; output++) {
    const a = rowsWhere(u, n, output, 0);
    const b = rowsWhere(u, n, output, 1);
    mulInto(k, adjoint(a, half, d), b, d, half, d);
    const flips = Float64Array.from({ length: n }, (_, j) => partOn(k, n, j));
    mulInto(k, adjoint(b, half, d), b, d, half, d);
    for (let j = 0; j < n; j++) {
      const signs = partOn(k, n, j);
      kept[output * n + j] = (flips[j]! + signs) / (2 * d);
      measured[output * n + j] = Math.sqrt(signs / d);
    }
  }
  return { kept, measured };
}

/** The 2^(n-1) rows of u in which the output's bit has the given value. */
function rowsWhere(u: Float64Array, n: number, output: number, value: 0 | 1): Float64Array {
  const d = 2 ** n;
  const stride = 2 ** (n - 1 - output);
  const out = new Float64Array(d * d);
  let to = 0;
  for (let row = 0; row < d; row++) {
    if ((row & stride ? 1 : 0) !== value) continue;
    out.set(u.subarray(row * d, row * d + d), to * d);
    out.set(u.subarray(d * d + row * d, d * d + row * d + d), (d * d) / 2 + to * d);
    to++;
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
