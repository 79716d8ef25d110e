/**
 * Recognises what a unitary is made of: factors on separate wires, a wire that only selects, a permutation.
 *
 * Shape: u is 2^n x 2^n, planar, wire 0 most significant.
 * Factors: u = a x b for a split of the wires into two groups if and only if all blocks of u over the first group are
 * multiples of one matrix (operator-Schmidt rank 1). All splits are tried, the smallest groups first.
 * Selecting wire: u = (a x 1) diag(g1, g2) (b x 1) if and only if the operator-Schmidt rank between the wire and the rest is
 * at most 2 (Cohen, Yu, PRA 87, 022329 (2013)). The two matrices on the wire that span the sum are then a d b with
 * diagonal d, so that the eigenvectors of f^-1 e, f and e in the span, are b^dag.
 * What is found is confirmed entry by entry to `TOLERANCE`.
 * Cost: 2^(n-1) * 4^n at most for the factors, n * 4^n for the rest.
 */
import { withWireOrder } from '../circuit/unitary.ts';
import { adjoint, kron, mul } from '../numeric/complex-matrix.ts';
import { quartersOf } from '../numeric/cosine-sine.ts';
import { hermitianEigen } from '../numeric/hermitian-eigen.ts';
import { nearestUnitary } from '../numeric/nearest-unitary.ts';
import { unitaryEigen } from '../numeric/unitary-eigen.ts';

/** Entries that differ by less than this count as equal. */
const TOLERANCE = 1e-12;
/** Operator-Schmidt weights below this count as zero at first sight: the square root of rounding. */
const WEIGHT_TOLERANCE = 1e-7;

export type Factor = { wires: number[]; matrix: Float64Array };

/** The finest factors of u; one factor with all wires when there are none. */
export function factorsOf(u: Float64Array, wires: number): Factor[] {
  const all = Array.from({ length: wires }, (_, k) => k);
  // subsets that contain wire 0, small ones and small complements first
  const subsets: number[] = [];
  for (let subset = 1; subset < 2 ** wires - 1; subset += 2) subsets.push(subset);
  const size = (subset: number): number => all.filter((k) => (subset >> k) & 1).length;
  const weight = (subset: number): number => Math.min(size(subset), wires - size(subset));
  subsets.sort((a, b) => weight(a) - weight(b) || a - b);
  for (const subset of subsets) {
    const inside = all.filter((k) => (subset >> k) & 1);
    const outside = all.filter((k) => !((subset >> k) & 1));
    const split = splitAt(u, inside, outside);
    if (!split) continue;
    const named = (own: readonly number[], matrix: Float64Array): Factor[] =>
      factorsOf(matrix, own.length).map((factor) => ({
        ...factor,
        wires: factor.wires.map((wire) => own[wire]!),
      }));
    return [...named(inside, split.first), ...named(outside, split.second)];
  }
  return [{ wires: all, matrix: u }];
}

/** u = first x second over two groups of wires, or undefined. */
function splitAt(
  u: Float64Array,
  inside: readonly number[],
  outside: readonly number[],
): { first: Float64Array; second: Float64Array } | undefined {
  const [p, q] = [2 ** inside.length, 2 ** outside.length];
  const d = p * q;
  const ordered = withWireOrder(u, [...inside, ...outside]);
  let largest = 0;
  for (let k = 0; k < d * d; k++) {
    const size = (at: number): number => ordered[at]! ** 2 + ordered[d * d + at]! ** 2;
    if (size(k) > size(largest)) largest = k;
  }
  const [row, column] = [Math.floor(largest / d), largest % d];
  const second = new Float64Array(2 * q * q);
  const first = new Float64Array(2 * p * p);
  const top = (Math.floor(row / q) * d + Math.floor(column / q)) * q;
  for (let i = 0; i < q; i++) {
    for (let j = 0; j < q; j++) {
      second[i * q + j] = ordered[top + i * d + j]!;
      second[q * q + i * q + j] = ordered[d * d + top + i * d + j]!;
    }
  }
  // the block is a multiple of a unitary if u splits
  const norm = second.reduce((sum, x) => sum + x * x, 0);
  const scale = Math.sqrt(q / norm);
  for (let k = 0; k < second.length; k++) second[k]! *= scale;
  // entries of the first factor by the largest entry of the second
  const within = (row % q) * q + (column % q);
  const [x, y] = [second[within]!, second[q * q + within]!];
  const square = x * x + y * y;
  for (let i = 0; i < p; i++) {
    for (let j = 0; j < p; j++) {
      const at = (i * q + (row % q)) * d + j * q + (column % q);
      const [a, b] = [ordered[at]!, ordered[d * d + at]!];
      first[i * p + j] = (a * x + b * y) / square;
      first[p * p + i * p + j] = (b * x - a * y) / square;
    }
  }
  for (let at = 0; at < d * d; at++) {
    const [i, j] = [Math.floor(at / d), at % d];
    const one = Math.floor(i / q) * p + Math.floor(j / q);
    const two = (i % q) * q + (j % q);
    const [a, b] = [first[one]!, first[p * p + one]!];
    const [c, e] = [second[two]!, second[q * q + two]!];
    if (Math.abs(ordered[at]! - a * c + b * e) > TOLERANCE) return undefined;
    if (Math.abs(ordered[d * d + at]! - a * e - b * c) > TOLERANCE) return undefined;
  }
  return { first: nearestUnitary(first, p), second: nearestUnitary(second, q) };
}

/** u = (a x 1) diag(g1, g2) (b x 1), a and b on `wire`, g1 and g2 on the others in their order. */
export type Selection = {
  wire: number;
  a: Float64Array;
  b: Float64Array;
  g1: Float64Array;
  g2: Float64Array;
};

export function selectionOn(u: Float64Array, wires: number, wire: number): Selection | undefined {
  const m = 2 ** (wires - 1);
  const rest = Array.from({ length: wires }, (_, k) => k).filter((k) => k !== wire);
  const ordered = withWireOrder(u, [wire, ...rest]);
  const one = Float64Array.from([1, 0, 0, 1, 0, 0, 0, 0]);
  const plain = diagonalised(ordered, m, one, one);
  if (plain) return { wire, ...plain };
  const span = spanOnFirst(quartersOf(ordered, m), m);
  if (!span) return undefined;
  const [e, f] = span;
  // f is some matrix of the span that has an inverse: d of almost every one has no zero
  const mixed = e.map((x, k) => 0.8 * x + 0.6 * f[k]!);
  const inverse = inverseOf(mixed);
  if (!inverse) return undefined;
  const { vectors } = unitaryEigen(nearestNormal(mul(inverse, f, 2)), 2);
  const b = adjoint(vectors, 2);
  const a = nearestUnitary(withUnitColumns(mul(mixed, vectors, 2)), 2);
  const found = diagonalised(ordered, m, a, b);
  return found ? { wire, ...found } : undefined;
}

/** The parts of a^dag u b^dag, when it is block diagonal. */
function diagonalised(
  u: Float64Array,
  m: number,
  a: Float64Array,
  b: Float64Array,
): Omit<Selection, 'wire'> | undefined {
  const one = new Float64Array(2 * m * m);
  for (let k = 0; k < m; k++) one[k * (m + 1)] = 1;
  const isPlain = [a, b].every((matrix) => matrix[1] === 0 && matrix[0] === 1);
  const inner = isPlain
    ? u
    : mul(mul(kron(adjoint(a, 2), one, 2, m), u, 2 * m), kron(adjoint(b, 2), one, 2, m), 2 * m);
  const [g1, off1, off2, g2] = quartersOf(inner, m);
  const isZero = (block: Float64Array): boolean => block.every((x) => Math.abs(x) < TOLERANCE);
  if (!isZero(off1) || !isZero(off2)) return undefined;
  return { a, b, g1: nearestUnitary(g1, m), g2: nearestUnitary(g2, m) };
}

/** Two 2 x 2 matrices that span the operators on the first wire, when two are enough. */
function spanOnFirst(
  quarters: readonly Float64Array[],
  m: number,
): [Float64Array, Float64Array] | undefined {
  const gram = new Float64Array(32);
  for (let i = 0; i < 4; i++) {
    for (let j = 0; j < 4; j++) {
      const [p, q] = [quarters[i]!, quarters[j]!];
      let [re, im] = [0, 0];
      for (let at = 0; at < m * m; at++) {
        re += p[at]! * q[at]! + p[m * m + at]! * q[m * m + at]!;
        im += p[m * m + at]! * q[at]! - p[at]! * q[m * m + at]!;
      }
      gram[i * 4 + j] = re / m;
      gram[16 + i * 4 + j] = im / m;
    }
  }
  const { values, vectors } = hermitianEigen(gram, 4);
  if (Math.abs(values[1]!) > WEIGHT_TOLERANCE) return undefined;
  const column = (k: number): Float64Array =>
    Float64Array.from({ length: 8 }, (_, at) => vectors[(at < 4 ? 0 : 16) + (at % 4) * 4 + k]!);
  return [column(3), column(2)];
}

function inverseOf(a: Float64Array): Float64Array | undefined {
  const [ar, br, cr, dr, ai, bi, ci, di] = a as unknown as [
    number, number, number, number, number, number, number, number,
  ]; // biome-ignore format: the eight numbers of a 2 x 2 matrix
  const re = ar * dr - ai * di - br * cr + bi * ci;
  const im = ar * di + ai * dr - br * ci - bi * cr;
  const square = re * re + im * im;
  if (square < 1e-12) return undefined;
  const over = (x: number, y: number): [number, number] => [
    (x * re + y * im) / square,
    (y * re - x * im) / square,
  ];
  const [d, b, c, e] = [over(dr, di), over(-br, -bi), over(-cr, -ci), over(ar, ai)];
  return Float64Array.from([d[0], b[0], c[0], e[0], d[1], b[1], c[1], e[1]]);
}

/** A normal matrix has the eigenvectors of its traceless part over its size; a unitary has the same. */
function nearestNormal(a: Float64Array): Float64Array {
  const out = a.slice();
  const [re, im] = [(a[0]! + a[3]!) / 2, (a[4]! + a[7]!) / 2];
  for (const k of [0, 3]) {
    out[k]! -= re;
    out[4 + k]! -= im;
  }
  const size = Math.sqrt(out.reduce((sum, x) => sum + x * x, 0) / 2);
  // a multiple of a reflection v.sigma, up to a phase
  return size > 0 ? out.map((x) => x / size) : out;
}

function withUnitColumns(a: Float64Array): Float64Array {
  const out = a.slice();
  for (const column of [0, 1]) {
    const at = [column, 2 + column, 4 + column, 6 + column];
    const size = Math.hypot(...at.map((k) => a[k]!));
    if (size > 0) for (const k of at) out[k]! /= size;
  }
  return out;
}

/** u |x> = e^{i phases[x]} |to[x]>. */
export type Monomial = { to: Int32Array; phases: Float64Array };

export function monomialOf(u: Float64Array, wires: number): Monomial | undefined {
  const d = 2 ** wires;
  const to = new Int32Array(d);
  const phases = new Float64Array(d);
  for (let x = 0; x < d; x++) {
    let found = -1;
    for (let row = 0; row < d; row++) {
      const size = Math.hypot(u[row * d + x]!, u[d * d + row * d + x]!);
      if (size < TOLERANCE) continue;
      if (found >= 0) return undefined;
      found = row;
    }
    if (found < 0) return undefined;
    to[x] = found;
    phases[x] = Math.atan2(u[d * d + found * d + x]!, u[found * d + x]!);
  }
  return { to, phases };
}
