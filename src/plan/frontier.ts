/**
 * The trade between wires and depth: for each number of wires the least deep plan that was found.
 *
 * Method: for every number of wires a few orders of outputs are tried: the plan with the fewest wires, and
 * greedy orders that let first leave what is finished first when wires are no concern, with more or less
 * weight on how many inputs a choice makes enter. Each is scheduled, put on wires and measured. A plan for
 * fewer wires is one for more wires as well, so depth never rises with wires.
 * Cost: `ORDERS` schedules for each number of wires.
 */
import type { Circuit } from '../circuit/circuit.ts';
import { operationWires } from '../circuit/circuit.ts';
import { countCircuit } from '../circuit/counts.ts';
import { inputsOf } from '../survey/relation.ts';
import type { NarrowedCircuit } from './assemble.ts';
import { narrowAlong, type StructurePlan } from './structure-plan.ts';

/** Weight of one more input against one more level, for the greedy orders. */
const ENTRANCE_WEIGHTS = [0, 1, 5, 25];
/** Above this many wires only some numbers of wires are tried. */
const EVERY_WIRE_MAX = 128;

export type FrontierPoint = {
  wires: number;
  depth: number;
  /** What was minimised: depth, unless a score was given. */
  score: number;
  order: readonly number[];
};

export type FrontierOptions = {
  /** What to minimise instead of depth: for example the logarithm of failure on a device. */
  score?: (circuit: Circuit) => number;
  stopped?: () => boolean;
};

/** One point for each number of wires, from the fewest to as many as there are carriers at once. */
export function frontier(plan: StructurePlan, options: FrontierOptions = {}): FrontierPoint[] {
  const { stopped = () => false } = options;
  const points: FrontierPoint[] = [];
  const most = Math.max(plan.width.width, plan.original.wires);
  for (const wires of wireNumbers(plan.width.width, most)) {
    if (points.length > 0 && stopped()) break;
    const { narrowed, order, score } = bestAt(plan, wires, options.score);
    const depth = countCircuit(narrowed.circuit).depth;
    const last = points.at(-1);
    const isBetter = !last || score < last.score;
    points.push(isBetter ? { wires, depth, score, order } : { ...last, wires });
  }
  return points;
}

function wireNumbers(least: number, most: number): number[] {
  if (most - least <= EVERY_WIRE_MAX) {
    return Array.from({ length: most - least + 1 }, (_, k) => least + k);
  }
  const out: number[] = [];
  for (let wires = least; wires < most; wires = Math.max(wires + 1, Math.round(wires * 1.15))) {
    out.push(wires);
  }
  return [...out, most];
}

/** The best circuit found on at most `wires` wires (not below the plan's width). */
export function bestAt(
  plan: StructurePlan,
  wires: number,
  score: (circuit: Circuit) => number = (circuit) => countCircuit(circuit).depth,
): { narrowed: NarrowedCircuit; order: readonly number[]; score: number } {
  const limit = Math.max(wires, plan.width.width);
  let best = attempt(plan, plan.width.order, limit, score);
  const levels = endLevels(plan);
  const tried = new Set([plan.width.order.join()]);
  for (const weight of ENTRANCE_WEIGHTS) {
    const order = greedyOrder(plan, levels, weight, limit);
    const key = order?.join() ?? '';
    if (!order || tried.has(key)) continue;
    tried.add(key);
    const next = attempt(plan, order, limit, score);
    if (next.score < best.score) best = next;
  }
  return best;
}

function attempt(
  plan: StructurePlan,
  order: readonly number[],
  wires: number,
  score: (circuit: Circuit) => number,
): { narrowed: NarrowedCircuit; order: readonly number[]; score: number } {
  const narrowed = narrowAlong(plan, order, wires);
  return { narrowed, order, score: score(narrowed.circuit) };
}

/** When each carrier would be finished if there were wires enough, in levels of operations. */
function endLevels({ structure }: StructurePlan): Int32Array {
  const { lives, nodes } = structure.circuit;
  const level = new Int32Array(lives.length);
  for (const { operation, end } of nodes) {
    if (!operation || end >= 0) continue;
    const carriers = operationWires(operation);
    let top = 0;
    for (const carrier of carriers) top = Math.max(top, level[carrier]!);
    for (const carrier of carriers) level[carrier] = top + 1;
  }
  return level;
}

/** Outputs by level, as far as the number of wires allows; null when the greedy choice gets stuck. */
function greedyOrder(
  plan: StructurePlan,
  levels: Int32Array,
  weight: number,
  wires: number,
): number[] | null {
  const { relation } = plan.scheduling;
  const needs = relation.rows.map((_, output) => inputsOf(relation, output));
  const neededBy: number[][] = Array.from({ length: relation.inputs }, () => []);
  needs.forEach((list, output) => {
    for (const input of list) neededBy[input]!.push(output);
  });
  const need = Int32Array.from(needs, (list) => list.length);
  const hasLeft = new Uint8Array(relation.outputs);
  const isThere = new Uint8Array(relation.inputs);
  const order: number[] = [];
  let held = 0;
  while (order.length < relation.outputs) {
    let choice = -1;
    let least = Number.POSITIVE_INFINITY;
    for (let k = 0; k < relation.outputs; k++) {
      if (hasLeft[k] || held + need[k]! > wires) continue;
      const cost = levels[k]! + weight * need[k]!;
      if (cost < least) [choice, least] = [k, cost];
    }
    if (choice < 0) return null;
    const complete: number[] = need[choice] === 0 ? [choice] : [];
    for (const input of needs[choice]!) {
      if (isThere[input]) continue;
      isThere[input] = 1;
      held++;
      for (const output of neededBy[input]!) if (--need[output]! === 0) complete.push(output);
    }
    complete.sort((a, b) => levels[a]! - levels[b]! || a - b);
    for (const output of complete) {
      hasLeft[output] = 1;
      held--;
      order.push(output);
    }
  }
  return order;
}
