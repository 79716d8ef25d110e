/**
 * Decides from the matrix what is possible: on how few wires an equal circuit exists, along which order, or
 * how far the best attempt on fewer wires must be off.
 *
 * Method: the influence table decides for each output and input whether the one can leave before the other
 * enters (`survey/influence.ts`: theorem and bound there).
 * Limits: `INFLUENCE_WIRES_MAX` wires; the bound over sets of wires up to `SET_BOUND_WIRES_MAX`, above that the
 * bound by single pairs.
 */
import { influenceFloor, influenceTables } from '../survey/influence.ts';
import { inputsOf, type Relation, relate, relationFromTable } from '../survey/relation.ts';
import { planWidth } from '../survey/width.ts';
import { nearestPlan, SET_BOUND_WIRES_MAX } from './causal-bound.ts';
import { type Chain, type ChainPlan, chainDistance, chainWidth, factorChain } from './chain.ts';
import { improveChain } from './improve-chain.ts';

/** Larger chains are not improved by polar updates: each costs many products of 2^n x 2^n matrices. */
const IMPROVE_WIRES_MAX = 8;
const SWEEPS_MAX = 60;

export type Question = {
  u: Float64Array;
  wires: number;
  /** One per output: only the probabilities of its bit count. */
  measured: readonly boolean[];
  stopped(): boolean;
};

export type CausalWidth = {
  width: number;
  plan: ChainPlan;
  /** The influence that decides for each pair, table[output * n + input]; row by row kept or measured. */
  table: Float64Array;
};

/** The fewest wires of any equal circuit (for every input), and an order that has them. */
export function causalWidth({ u, wires: n, measured }: Question): CausalWidth {
  const { kept, measured: bits } = influenceTables(u, n);
  const table = new Float64Array(n * n);
  const floors = measured.map((is) => (is ? Math.sqrt(influenceFloor(n)) : influenceFloor(n)));
  const relation: Relation = relationFromTable(table, n, 0);
  for (let output = 0; output < n; output++) {
    for (let input = 0; input < n; input++) {
      const at = output * n + input;
      table[at] = (measured[output] ? bits : kept)[at]!;
      if (table[at] > floors[output]!) relate(relation, output, input);
    }
  }
  return { ...planOf(relation), table };
}

function planOf(relation: Relation): { width: number; plan: ChainPlan } {
  const { order, width } = planWidth(relation);
  const needs = Array.from({ length: relation.outputs }, (_, out) => inputsOf(relation, out));
  return { width, plan: { order, needs } };
}

export type Shortfall = {
  /** Lower bound on the process infidelity of any circuit on that many wires. */
  infidelity: number;
  /** The pair, or the first of the pairs, that such a circuit would have to set free at least cost. */
  leaves: number;
  enters: number;
  plan: ChainPlan;
};

/** What a circuit on `fewer` wires costs at least, for kept outputs; `table` as from `causalWidth`. */
export function shortfall(
  u: Float64Array,
  n: number,
  fewer: number,
  table: Float64Array,
): Shortfall {
  const { lower, plan } =
    n <= SET_BOUND_WIRES_MAX ? nearestPlan(u, n, fewer, table) : thresholdPlan(table, n, fewer);
  const leaves = plan.order[0]!;
  const enters = Array.from({ length: n }, (_, k) => k).filter(
    (input) => !plan.needs[leaves]!.includes(input),
  );
  const worst = enters.reduce((a, b) => (table[leaves * n + b]! > table[leaves * n + a]! ? b : a));
  return { infidelity: lower, leaves, enters: worst, plan };
}

/** The least threshold at which dropping all weaker pairs makes the width small enough. */
function thresholdPlan(
  table: Float64Array,
  n: number,
  fewer: number,
): { lower: number; plan: ChainPlan } {
  const levels = [...new Set(table)].sort((a, b) => a - b);
  let [low, high] = [0, levels.length - 1];
  while (low < high) {
    const middle = (low + high) >> 1;
    const { width } = planWidth(relationFromTable(table, n, levels[middle]!));
    if (width <= fewer) high = middle;
    else low = middle + 1;
  }
  const lower = levels[low]!;
  return { lower, plan: planOf(relationFromTable(table, n, lower)).plan };
}

export type Attempt = { chain: Chain; distance: number; width: number };

/** The chain along a plan, improved as far as its shape allows; for kept outputs. */
export function attemptChain(question: Question, plan: ChainPlan, dependenceMin?: number): Attempt {
  const { u, wires: n, stopped } = question;
  const start = factorChain(u, n, plan, dependenceMin);
  const distance = chainDistance(u, start);
  if (n > IMPROVE_WIRES_MAX || distance < 1e-20) {
    return { chain: start, distance, width: chainWidth(start) };
  }
  const improved = improveChain(u, start, SWEEPS_MAX, stopped);
  return { chain: improved.chain, distance: improved.distance, width: chainWidth(start) };
}
