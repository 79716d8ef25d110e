/**
 * Finds the order in which outputs leave that needs the fewest wires.
 *
 * Given which inputs each output needs, emitting outputs in the order o1, o2, ... holds, just before o_k leaves,
 * |N(o1) u ... u N(o_k)| - (k - 1) wires; the width is the smallest maximum over all orders, at least 1.
 * Method: up to `EXACT_OUTPUTS_MAX` outputs, dynamic programming over sets of outputs (the union of a set is that of
 * the set less its lowest bit); beyond, beam search from a greedy start, with a lower bound.
 * Lower bound: before the first output leaves, all its inputs are there: min_i |N(i)|; and the same for the time
 * reverse (a circuit and its reverse have equal widths; arXiv:2210.08039).
 * Ties: the lexicographically smallest order among the best that the search sees.
 * Cost: 2^n n steps and 5 x 2^n bytes when exact.
 */
import { bitCount, inputsOf, type Relation, relates } from './relation.ts';

export const EXACT_OUTPUTS_MAX = 22;
const BEAM_WIDTH = 64;

export type WidthPlan = {
  /** Outputs in the order in which they leave. */
  order: number[];
  width: number;
  lowerBound: number;
  exact: boolean;
  /** In words: how the order was found. */
  method: string;
};

export function planWidth(relation: Relation): WidthPlan {
  const { outputs, inputs } = relation;
  if (outputs === 0) {
    return { order: [], width: Math.max(1, inputs), lowerBound: 1, exact: true, method: 'trivial' };
  }
  if (outputs <= EXACT_OUTPUTS_MAX && inputs <= 31) return exactPlan(relation);
  const plan = beamPlan(relation);
  const lowerBound = lowerBoundOf(relation);
  return { ...plan, lowerBound, exact: plan.width === lowerBound, method: 'beam search' };
}

/** The largest number of wires held at once when outputs leave in this order. */
export function widthOfOrder(relation: Relation, order: readonly number[]): number {
  const union = new Uint32Array(relation.rows[0]?.length ?? 0);
  let width = 1;
  order.forEach((output, k) => {
    relation.rows[output]!.forEach((word, w) => {
      union[w]! |= word;
    });
    width = Math.max(width, bitCount(union) - k);
  });
  return width;
}

function exactPlan(relation: Relation): WidthPlan {
  const n = relation.outputs;
  const size = 2 ** n;
  const masks = Int32Array.from(relation.rows, (row) => row[0]! | 0);
  const union = new Int32Array(size);
  const best = new Uint8Array(size);
  const last = new Uint8Array(size);
  for (let set = 1; set < size; set++) {
    const low = 31 - Math.clz32(set & -set);
    union[set] = union[set & (set - 1)]! | masks[low]!;
    let least = 255;
    let choice = 0;
    let members = 0;
    for (let rest = set; rest !== 0; rest &= rest - 1) {
      members++;
      const bit = rest & -rest;
      const before = best[set ^ bit]!;
      // <= : the highest output leaves last among equals, so that low numbers leave first
      if (before <= least) {
        least = before;
        choice = 31 - Math.clz32(bit);
      }
    }
    const held = popCount(union[set]!) - (members - 1);
    best[set] = Math.max(least, held);
    last[set] = choice;
  }
  const order: number[] = [];
  for (let set = size - 1; set > 0; ) {
    const output = last[set]!;
    order.push(output);
    set ^= 1 << output;
  }
  const width = Math.max(1, best[size - 1]!);
  return {
    order: order.reverse(),
    width,
    lowerBound: width,
    exact: true,
    method: 'exact: dynamic programming over sets of outputs',
  };
}

function popCount(word: number): number {
  return bitCount(Uint32Array.of(word));
}

type Partial = { order: number[]; left: Set<number>; union: Uint32Array; width: number };

function beamPlan(relation: Relation): { order: number[]; width: number } {
  const words = relation.rows[0]!.length;
  const everything = new Set(Array.from({ length: relation.outputs }, (_, k) => k));
  let beam: Partial[] = [{ order: [], left: everything, union: new Uint32Array(words), width: 1 }];
  for (let k = 0; k < relation.outputs; k++) {
    const next: { from: Partial; output: number; held: number; width: number }[] = [];
    for (const from of beam) {
      for (const output of from.left) {
        const held = countUnion(from.union, relation.rows[output]!) - k;
        next.push({ from, output, held, width: Math.max(from.width, held) });
      }
    }
    next.sort((a, b) => a.width - b.width || a.held - b.held || a.output - b.output);
    const seen = new Set<string>();
    beam = [];
    for (const { from, output, width } of next) {
      const left = new Set(from.left);
      left.delete(output);
      const key = [...left].join();
      if (seen.has(key)) continue;
      seen.add(key);
      const union = from.union.map((word, w) => word | relation.rows[output]![w]!);
      beam.push({ order: [...from.order, output], left, union, width });
      if (beam.length >= BEAM_WIDTH) break;
    }
  }
  return { order: beam[0]!.order, width: beam[0]!.width };
}

function countUnion(a: Uint32Array, b: Uint32Array): number {
  return bitCount(a.map((word, w) => word | b[w]!));
}

function lowerBoundOf(relation: Relation): number {
  let forward = relation.inputs;
  for (const row of relation.rows) forward = Math.min(forward, bitCount(row));
  let backward = relation.outputs;
  for (let j = 0; j < relation.inputs; j++) {
    let count = 0;
    for (let i = 0; i < relation.outputs; i++) if (relates(relation, i, j)) count++;
    backward = Math.min(backward, count);
  }
  return Math.max(1, forward, backward);
}

/** For each output in order, the inputs that enter just before it leaves. */
export function entrances(relation: Relation, order: readonly number[]): number[][] {
  const seen = new Set<number>();
  return order.map((output) => {
    const fresh = inputsOf(relation, output).filter((input) => !seen.has(input));
    for (const input of fresh) seen.add(input);
    return fresh;
  });
}
