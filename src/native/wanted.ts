/**
 * What a synthesis must make: the columns of a unitary that count, all of them for a block, one for a state.
 *
 * Shape: matrix is 2^n x 2^n, planar; columns are basis states in ascending order.
 * Bounds count real numbers: a circuit has 3 per wire and some per entangler (4 for a CX), a target with 2^m of 2^n columns
 * 4^n - 1 for m = n (Shende, Markov, Bullock, PRA 69, 062321 (2004), proposition III.1), else 2^(n+m+1) - 4^m - 1 less m of the
 * free phases and rotations (Iten et al., PRA 93, 032318 (2016)).
 */
import { hilbertSchmidtDistance } from '../numeric/distance.ts';

/** A block: its whole unitary (planar), and which input basis states count. */
export type Wanted = { wires: number; matrix: Float64Array; columns: readonly number[] };

export function isWhole({ wires, columns }: Wanted): boolean {
  return columns.length === 2 ** wires;
}

/** D between the wanted columns and those made (2^n x columns, planar). */
export function wantedDistance(wanted: Wanted, made: Float64Array): number {
  const target = wantedColumns(wanted);
  // the formula of distance.ts is per column: it divides by the root of the number of entries
  const { distance } = hilbertSchmidtDistance(target, made);
  const d = 2 ** wanted.wires;
  return (distance * Math.sqrt(d * wanted.columns.length)) / wanted.columns.length;
}

export function wantedColumns({ wires, matrix, columns }: Wanted): Float64Array {
  const d = 2 ** wires;
  const c = columns.length;
  const out = new Float64Array(2 * d * c);
  for (let r = 0; r < d; r++) {
    columns.forEach((column, k) => {
      out[r * c + k] = matrix[r * d + column]!;
      out[d * c + r * c + k] = matrix[d * d + r * d + column]!;
    });
  }
  return out;
}

/** Least number of entanglers that bring `anglesEach` open angles each, for a generic target with this many columns. */
export function dimensionBound(wires: number, columns: number, anglesEach: number): number {
  const d = 2 ** wires;
  const m = Math.log2(columns);
  const free =
    columns === d ? 4 ** wires - 3 * wires - 1 : 2 ** (wires + m + 1) - 4 ** m - 2 * wires - m - 1;
  return Math.max(0, Math.ceil(free / anglesEach));
}

/** Wires that start in |0> first, each group ascending; the place of a wire in it is its wire in the template. */
export function wireOrder({ wires, columns }: Wanted): number[] {
  const all = Array.from({ length: wires }, (_, k) => k);
  const isZero = (wire: number): boolean =>
    columns.every((column) => (column & (2 ** (wires - 1 - wire))) === 0);
  return [...all.filter(isZero), ...all.filter((wire) => !isZero(wire))];
}

/** The wanted columns with rows and columns in the order of the template's wires. */
export function reordered(wanted: Wanted, order: readonly number[]): Float64Array {
  const { wires, columns } = wanted;
  const d = 2 ** wires;
  const c = columns.length;
  const move = (state: number): number =>
    order.reduce(
      (sum, wire, k) => sum + (state & (2 ** (wires - 1 - wire)) ? 2 ** (wires - 1 - k) : 0),
      0,
    );
  const from = wantedColumns(wanted);
  const rank = columns.map(move);
  const out = new Float64Array(2 * d * c);
  for (let r = 0; r < d; r++) {
    rank.forEach((to, k) => {
      out[move(r) * c + to] = from[r * c + k]!;
      out[d * c + move(r) * c + to] = from[d * c + r * c + k]!;
    });
  }
  return out;
}
