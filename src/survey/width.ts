/**
 * Finds the order in which outputs leave that needs the fewest wires.
 *
 * Given which inputs each output needs, emitting outputs in the order o1, o2, ... holds, just before o_k
 * leaves, |N(o1) u ... u N(o_k)| - (k - 1) wires; the width is the smallest maximum over all orders, at least
 * 1. (For one layer of commuting two-wire gates this is the pathwidth of the interaction graph plus one.)
 * Method: up to `EXACT_OUTPUTS_MAX` outputs, dynamic programming over sets of outputs (the union of a set is
 * that of the set less its lowest bit), unless a short search proves its answer. Beyond, beam search in both
 * directions of time (a circuit and its reverse have equal widths; arXiv:2210.08039), a lower bound, and
 * branch and bound between the two (`width-search.ts`).
 * Ties: when exact, high outputs leave late; beyond, fixed by the search: the same relation gives the same
 * order.
 * Cost: 2^n n steps and 6 x 2^n bytes when exact.
 */
import type { Relation } from './relation.ts';
import { lowerBoundOf } from './width-bound.ts';
import type { WidthOptions, WidthPlan } from './width-plan.ts';
import { searchOrder } from './width-search.ts';

export type { WidthOptions, WidthPlan } from './width-plan.ts';

export const EXACT_OUTPUTS_MAX = 22;
/** Up to this many outputs dynamic programming takes no time to speak of. */
const PLAIN_OUTPUTS_MAX = 14;

export function planWidth(relation: Relation, options: WidthOptions = {}): WidthPlan {
  const { outputs, inputs } = relation;
  if (outputs === 0) {
    return { order: [], width: Math.max(1, inputs), lowerBound: 1, exact: true, method: 'trivial' };
  }
  if (outputs <= PLAIN_OUTPUTS_MAX) return exactPlan(relation);
  const lowerBound = lowerBoundOf(relation);
  if (outputs > EXACT_OUTPUTS_MAX) return searchOrder(relation, lowerBound, options);
  // a short search often proves its answer, in less time than all sets of outputs take
  const found = searchOrder(relation, lowerBound, { ...options, effort: 1 });
  return found.exact ? found : exactPlan(relation);
}

function exactPlan(relation: Relation): WidthPlan {
  const n = relation.outputs;
  const size = 2 ** n;
  const needed = unionSizes(relation);
  const best = new Uint16Array(size);
  const last = new Uint8Array(size);
  for (let set = 1; set < size; set++) {
    let least = 0xffff;
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
    const held = needed[set]! - (members - 1);
    best[set] = Math.max(held, least);
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

/** For every set of outputs (bit k = output k) the number of inputs that they need together. */
function unionSizes({ outputs, rows }: Relation): Uint16Array {
  const size = 2 ** outputs;
  const sizes = new Uint16Array(size);
  const union = new Int32Array(size);
  const words = rows[0]?.length ?? 0;
  for (let w = 0; w < words; w++) {
    for (let set = 1; set < size; set++) {
      const low = 31 - Math.clz32(set & -set);
      let x = union[set & (set - 1)]! | rows[low]![w]!;
      union[set] = x;
      x -= (x >>> 1) & 0x55555555;
      x = (x & 0x33333333) + ((x >>> 2) & 0x33333333);
      sizes[set]! += Math.imul((x + (x >>> 4)) & 0x0f0f0f0f, 0x01010101) >>> 24;
    }
  }
  return sizes;
}
