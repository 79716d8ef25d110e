/**
 * The fewest wires that can make a state from |0...0>, outputs being handed on one by one.
 *
 * After the first k outputs of an order have left, what is kept must hold the Schmidt rank between them and the
 * rest: width = 1 + max_k ceil(log2 rank_k), the least over all orders by dynamic programming over sets.
 * Source: sequential generation, Schoen, Solano, Verstraete, Cirac, Wolf, PRL 95, 110503 (2005).
 * Shape: state has 2^n amplitudes, planar.
 * Fewer wires: a state of rank at most 2^(wires - 1) across a cut overlaps with this one by at most the sum of
 * so many largest squared coefficients (Eckart, Young, Psychometrika 1, 211 (1936)); the least worst cut over
 * all orders.
 * Cost: 2^(n-1) singular value decompositions. Limit: `STATE_WIDTH_WIRES_MAX` wires.
 */
import { svd } from '../numeric/svd.ts';

export const STATE_WIDTH_WIRES_MAX = 10;
/** Schmidt coefficients below this are rounding. */
const COEFFICIENT_MIN = 1e-10;

export type StateWidth = {
  width: number;
  order: number[];
  /** Schmidt rank after each output of the order has left. */
  ranks: number[];
  /** For each smaller number of wires, how far any state made on so few must be from this one. */
  prices: { wires: number; infidelityAtLeast: number }[];
};

export function stateWidth(state: Float64Array, n: number): StateWidth {
  const full = 2 ** n - 1;
  // per set of outputs: squared Schmidt coefficients against the rest, descending
  const weights: Float64Array[] = [Float64Array.of(1)];
  for (let set = 1; set < full; set++) {
    const rest = full ^ set;
    weights[set] = set > rest ? weights[rest]! : schmidtWeights(state, n, set);
  }
  weights[full] = Float64Array.of(1);
  const rank = weights.map(
    (list) => list.filter((weight) => weight > COEFFICIENT_MIN * COEFFICIENT_MIN).length,
  );
  const { value: width, order } = bestOrder(
    n,
    rank.map((r) => 1 + Math.ceil(Math.log2(Math.max(1, r)))),
  );
  let set = 0;
  const ranks = order.map((output) => {
    set |= 1 << output;
    return rank[set]!;
  });
  const prices: StateWidth['prices'] = [];
  for (let wires = width - 1; wires >= 1; wires--) {
    // Eckart-Young: rank 2^(wires - 1) keeps at most the largest weights
    const lost = weights.map((list) => list.slice(2 ** (wires - 1)).reduce((x, y) => x + y, 0));
    prices.push({ wires, infidelityAtLeast: bestOrder(n, lost).value });
  }
  return { width, order, ranks, prices };
}

/** The order of outputs whose worst prefix costs least, by dynamic programming over sets. */
function bestOrder(n: number, costs: readonly number[]): { value: number; order: number[] } {
  const size = 2 ** n;
  const best = new Float64Array(size);
  const last = new Int32Array(size).fill(-1);
  for (let set = 1; set < size; set++) {
    let least = Number.POSITIVE_INFINITY;
    for (let k = 0; k < n; k++) {
      if (!(set & (1 << k))) continue;
      // <= : the highest output leaves last among equals
      if (best[set ^ (1 << k)]! <= least) {
        least = best[set ^ (1 << k)]!;
        last[set] = k;
      }
    }
    best[set] = Math.max(least, costs[set]!);
  }
  const order: number[] = [];
  for (let set = size - 1; set > 0; set ^= 1 << last[set]!) order.push(last[set]!);
  return { value: best[size - 1]!, order: order.reverse() };
}

/** Squared Schmidt coefficients between the outputs in the set (bit k = output k) and the others. */
function schmidtWeights(state: Float64Array, n: number, set: number): Float64Array {
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
  return s.map((coefficient) => coefficient * coefficient);
}
