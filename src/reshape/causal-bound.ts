/**
 * Bounds from below how far a unitary is from every circuit on fewer wires, and finds the nested order of
 * leaving and entering for which that bound is least.
 *
 * Convention: bounds are on the process infidelity 1 - F, F = |Tr(U^dag V)|^2 / d^2.
 * Method: let V be any circuit in which the outputs O, |O| = k, have left before the inputs J enter. For a
 * Pauli P on O, V^dag P V is trivial on J, so || U^dag P U - V^dag P V || is at least the distance s_P of
 * U^dag P U from its average over J. The 4^k Paulis twirl W = U V^dag over O:
 *   sum_P || U^dag P U - V^dag P V ||_F^2 = 2 4^k d - 2 2^k || Tr_O W ||_F^2,
 * and || Tr_O W ||_F^2 >= 2^k |Tr W|^2 / d by Cauchy and Schwarz, hence
 *   1 - F >= (1 / (2 4^k d)) sum_P s_P^2 = (1 - || T^dag T ||_F^2 / (2^k 2^|J| d)) / 2,
 * with T the matrix of U whose rows are (outputs not in O, inputs in J) and whose columns are (O, other inputs);
 * the sum over Paulis is done by their completeness. k = |J| = 1 is the entry of the influence table
 * (Schumacher, Westmoreland, Quantum Inf. Process. 4, 13 (2005), made quantitative).
 * A circuit on w of n wires lets outputs leave in some order; before the k-th leaves, n - w - k + 1 inputs
 * at least have not entered, and these sets are nested. The least bound over all such families, by
 * dynamic programming over pairs of sets, holds for every circuit on w wires.
 * Cost: one T^dag T per pair of sets: 8 * 2^(2n + 2 min) flops or less; meant for n <= 6.
 */

import type { ChainPlan } from './chain.ts';
import { bitOffsets, otherPlaces } from './residual.ts';

/** Up to this many wires pairs of sets are all tried; above, single pairs of wires decide. */
export const SET_BOUND_WIRES_MAX = 6;

/** The lower bound on 1 - F of any circuit in which all of `outputs` leave before any of `inputs` enters. */
export function jointInfluence(
  u: Float64Array,
  n: number,
  outputs: readonly number[],
  inputs: readonly number[],
): number {
  const d = 2 ** n;
  const rowOut = bitOffsets(otherPlaces(outputs, n), n);
  const rowIn = bitOffsets(inputs, n);
  const columnOut = bitOffsets(outputs, n);
  const columnIn = bitOffsets(otherPlaces(inputs, n), n);
  const rows = rowOut.length * rowIn.length;
  const columns = columnOut.length * columnIn.length;
  // the side of the Gram matrix is the shorter one
  const transpose = rows < columns;
  const [size, length] = transpose ? [rows, columns] : [columns, rows];
  const re = new Float64Array(size * length);
  const im = new Float64Array(size * length);
  for (let r = 0; r < rows; r++) {
    const [ro, ri] = [Math.floor(r / rowIn.length), r % rowIn.length];
    for (let c = 0; c < columns; c++) {
      const [co, ci] = [Math.floor(c / columnIn.length), c % columnIn.length];
      const from = (rowOut[ro]! + columnOut[co]!) * d + rowIn[ri]! + columnIn[ci]!;
      const to = transpose ? r * length + c : c * length + r;
      re[to] = u[from]!;
      im[to] = u[d * d + from]!;
    }
  }
  const scale = 2 ** outputs.length * 2 ** inputs.length * d;
  return Math.max(0, (1 - gramNormSquared(re, im, size, length) / scale) / 2);
}

/** || T T^dag ||_F^2 for T given by its rows. */
function gramNormSquared(re: Float64Array, im: Float64Array, size: number, length: number): number {
  let sum = 0;
  for (let p = 0; p < size; p++) {
    for (let q = p; q < size; q++) {
      let [x, y] = [0, 0];
      for (let k = 0; k < length; k++) {
        const [a, b] = [re[p * length + k]!, im[p * length + k]!];
        const [c, e] = [re[q * length + k]!, im[q * length + k]!];
        x += a * c + b * e;
        y += b * c - a * e;
      }
      sum += (p === q ? 1 : 2) * (x * x + y * y);
    }
  }
  return sum;
}

export type NearestPlan = {
  /** No circuit on that many wires has a process infidelity below this. */
  lower: number;
  /** An order of leaving and entering for which the bound is that low. */
  plan: ChainPlan;
};

type Family = { worst: number; order: number[]; waiting: number[][] };

/**
 * The best nested family on `wires` of n wires. `table` is the influence table of kept outputs, table[out * n +
 * in]. n <= SET_BOUND_WIRES_MAX, 1 <= wires < n.
 */
export function nearestPlan(
  u: Float64Array,
  n: number,
  wires: number,
  table: Float64Array,
): NearestPlan {
  const cache = new Map<number, number>();
  const bound = (outputs: number, inputs: number): number => {
    const key = outputs * 2 ** n + inputs;
    let value = cache.get(key);
    if (value === undefined) {
      const [o, j] = [membersOf(outputs, n), membersOf(inputs, n)];
      const single = Math.max(...o.flatMap((out) => j.map((input) => table[out * n + input]!)));
      value = Math.max(single, jointInfluence(u, n, o, j));
      cache.set(key, value);
    }
    return value;
  };
  let layer = new Map<number, Family>();
  for (const inputs of subsetsOf(n, n - wires)) {
    for (let output = 0; output < n; output++) {
      const family = {
        worst: bound(1 << output, inputs),
        order: [output],
        waiting: [membersOf(inputs, n)],
      };
      keepBetter(layer, (1 << output) * 2 ** n + inputs, family);
    }
  }
  for (let k = 2; k <= n - wires; k++) {
    const next = new Map<number, Family>();
    for (const [key, family] of layer) {
      const [outputs, inputs] = [Math.floor(key / 2 ** n), key % 2 ** n];
      for (const input of membersOf(inputs, n)) {
        for (const output of membersOf(2 ** n - 1 - outputs, n)) {
          const [o, j] = [outputs | (1 << output), inputs & ~(1 << input)];
          const worst = Math.max(family.worst, bound(o, j));
          const waiting = [...family.waiting, membersOf(j, n)];
          keepBetter(next, o * 2 ** n + j, { worst, order: [...family.order, output], waiting });
        }
      }
    }
    layer = next;
  }
  const best = [...layer.values()].reduce((a, b) => (b.worst < a.worst ? b : a));
  return { lower: best.worst, plan: planOfFamily(best, n) };
}

function keepBetter(layer: Map<number, Family>, key: number, family: Family): void {
  const known = layer.get(key);
  if (!known || family.worst < known.worst) layer.set(key, family);
}

function planOfFamily({ order, waiting }: Family, n: number): ChainPlan {
  const all = Array.from({ length: n }, (_, k) => k);
  const needs = all.map((output) => {
    const position = order.indexOf(output);
    return position < 0 ? all : all.filter((input) => !waiting[position]!.includes(input));
  });
  return { order: [...order, ...all.filter((output) => !order.includes(output))], needs };
}

function membersOf(set: number, n: number): number[] {
  return Array.from({ length: n }, (_, k) => k).filter((k) => set & (1 << k));
}

function subsetsOf(n: number, size: number): number[] {
  return Array.from({ length: 2 ** n }, (_, set) => set).filter(
    (set) => membersOf(set, n).length === size,
  );
}
