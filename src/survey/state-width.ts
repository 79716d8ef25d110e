/**
 * The fewest wires that can make a state from |0...0>, outputs being handed on one by one.
 *
 * After the first k outputs of an order have left, what is kept must hold the Schmidt rank between them and the
 * rest: width = 1 + max_k ceil(log2 rank_k), the least over all orders by dynamic programming over sets.
 * Source: sequential generation, Schoen, Solano, Verstraete, Cirac, Wolf, PRL 95, 110503 (2005).
 * Shape: state has 2^n amplitudes, planar.
 * Cost: 2^(n-1) singular value decompositions. Limit: `STATE_WIDTH_WIRES_MAX` wires.
 */
import { svd } from '../numeric/svd.ts';

export const STATE_WIDTH_WIRES_MAX = 10;
/** Schmidt coefficients below this are rounding. */
const COEFFICIENT_MIN = 1e-10;

export type StateWidth = { width: number; order: number[]; ranks: number[] };

export function stateWidth(state: Float64Array, n: number): StateWidth {
  const size = 2 ** n;
  const full = size - 1;
  const rank = new Int32Array(size).fill(1);
  for (let set = 1; set < full; set++) {
    const rest = full ^ set;
    rank[set] = set > rest ? rank[rest]! : schmidtRank(state, n, set);
  }
  const best = new Int32Array(size).fill(1);
  const last = new Int32Array(size).fill(-1);
  for (let set = 1; set < size; set++) {
    let least = Number.MAX_SAFE_INTEGER;
    for (let k = 0; k < n; k++) {
      if (!(set & (1 << k))) continue;
      // <= : the highest output leaves last among equals
      if (best[set ^ (1 << k)]! <= least) {
        least = best[set ^ (1 << k)]!;
        last[set] = k;
      }
    }
    best[set] = Math.max(least, 1 + Math.ceil(Math.log2(rank[set]!)));
  }
  const order: number[] = [];
  for (let set = full; set > 0; set ^= 1 << last[set]!) order.push(last[set]!);
  order.reverse();
  let set = 0;
  const ranks = order.map((output) => {
    set |= 1 << output;
    return rank[set]!;
  });
  return { width: n === 0 ? 0 : best[full]!, order, ranks };
}

/** Rank between the outputs in the set (bit k = output k) and the others. */
function schmidtRank(state: Float64Array, n: number, set: number): number {
  const inside: number[] = [];
  const outside: number[] = [];
  for (let k = 0; k < n; k++) (set & (1 << k) ? inside : outside).push(2 ** (n - 1 - k));
  const [wide, tall] = [inside, outside].sort((a, b) => a.length - b.length) as [
    number[],
    number[],
  ];
  const offsets = (strides: number[]): number[] =>
    Array.from({ length: 2 ** strides.length }, (_, r) =>
      strides.reduce((sum, s, k) => sum + ((r >> k) & 1) * s, 0),
    );
  const [columns, rows] = [offsets(wide), offsets(tall)];
  const half = rows.length * columns.length;
  const matrix = new Float64Array(2 * half);
  rows.forEach((p, i) => {
    columns.forEach((q, j) => {
      matrix[i * columns.length + j] = state[p + q]!;
      matrix[half + i * columns.length + j] = state[2 ** n + p + q]!;
    });
  });
  const { s } = svd(matrix, rows.length, columns.length);
  return Math.max(1, s.filter((value) => value > COEFFICIENT_MIN).length);
}
