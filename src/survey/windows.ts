/**
 * Chooses the windows whose influence, in place of their structure, lets the whole circuit do with fewer wires.
 *
 * Taking a window as one gate of which only the influence counts can only loosen the relation between
 * carriers, so compatible windows (no common gate, no cycle between them) are taken greedily, in several
 * orders of preference, first by how many pairs of the whole each of them unties alone; then windows left out are tried in
 * place of those in their way; the windows without which the width stays the same are given back, the longest first, and
 * longer ones of the same influence take the place of those that stay.
 * Cost: linear in windows times nodes, and one width plan for each window taken.
 */
import { operationWires } from '../circuit/circuit.ts';
import { contracted } from './contracted.ts';
import type { StructureOfLives } from './early.ts';
import type { LifeCircuit } from './lives.ts';
import { closureRelation, type OrderRules } from './order.ts';
import { bitCount, type Relation } from './relation.ts';
import { planWidth, type WidthPlan } from './width.ts';
import { findWindows, type WindowCandidate, type WindowSearchOptions } from './window-search.ts';

export type WindowChoice = {
  windows: WindowCandidate[];
  /** Carriers x carriers, with the influence of the windows in place of their structure. */
  relation: Relation;
  width: WidthPlan;
  /** How many windows had an influence sparser than their structure. */
  candidates: number;
};

export type WindowOptions = WindowSearchOptions & {
  rules?: OrderRules;
  /** Effort for each width plan on the way, in million steps. */
  effort?: number;
};

/** Rules of order while windows are chosen. */
export const WINDOW_RULES: OrderRules = { commute: true, early: true };
const EFFORT = 5;
const EXCHANGES_MAX = 60;
/** How many windows are tried alone, times the nodes of the circuit. */
const ALONE_WORK_MAX = 2e6;
const LONGER_MIN = 3;
const LONGER_TRIED_MAX = 8;
/** Preferences: by gain, by few carriers, by gain for each gate. */
const PREFERENCES: readonly ((a: WindowCandidate, b: WindowCandidate) => number)[] = [
  (a, b) => b.gain - a.gain || a.nodes.length - b.nodes.length,
  (a, b) => a.carriers.length - b.carriers.length || b.gain - a.gain,
  (a, b) => b.gain / b.nodes.length - a.gain / a.nodes.length,
];

/** The fewest wires with the fewest windows found; no windows when structure does as well. */
export function chooseWindows(
  structure: StructureOfLives,
  structural: WidthPlan,
  options: WindowOptions = {},
): WindowChoice {
  const { rules = WINDOW_RULES, effort = EFFORT, stopped = () => false } = options;
  const { circuit, axesOf } = structure;
  const candidates = findWindows(circuit, axesOf, options);
  const relationWith = (chosen: readonly WindowCandidate[]): Relation => {
    const whole = contracted(circuit, chosen);
    return closureRelation(whole ?? circuit, rules, axesOf);
  };
  let best: WindowCandidate[] = [];
  let bestPlan = structural;
  let bestRelation = structure.relation;
  const untied = untiedAlone(candidates, circuit.nodes.length, structure.relation, relationWith, stopped); // biome-ignore format: one call
  const byUntied = (a: WindowCandidate, b: WindowCandidate): number =>
    (untied.get(b) ?? 0) - (untied.get(a) ?? 0) || a.nodes.length - b.nodes.length;
  for (const preference of [byUntied, ...PREFERENCES]) {
    if (stopped() || candidates.length === 0) break;
    const sorted = candidates
      .map((candidate, k) => ({ candidate, k }))
      .sort((a, b) => preference(a.candidate, b.candidate) || a.k - b.k);
    const chosen = compatible(
      circuit,
      sorted.map(({ candidate }) => candidate),
    );
    const relation = relationWith(chosen);
    const width = planWidth(relation, { effort });
    const isBetter =
      width.width < bestPlan.width ||
      (width.width === bestPlan.width && best.length > 0 && lengthOf(chosen) < lengthOf(best));
    if (isBetter) [best, bestPlan, bestRelation] = [chosen, width, relation];
  }
  // put in one that was left out, and leave out those that are in its way
  const left = candidates.map((candidate, k) => ({ candidate, k }));
  left.sort((a, b) => byUntied(a.candidate, b.candidate) || a.k - b.k);
  for (const { candidate } of left.slice(0, EXCHANGES_MAX)) {
    if (stopped()) break;
    if (best.includes(candidate)) continue;
    const chosen = compatible(circuit, [candidate, ...best]);
    const relation = relationWith(chosen);
    const [now, ties] = [tiesOf(bestRelation), tiesOf(relation)];
    if (ties > now) continue;
    const width = planWidth(relation, { effort });
    const isBetter = width.width < bestPlan.width || (width.width === bestPlan.width && ties < now);
    if (isBetter) [best, bestPlan, bestRelation] = [chosen, width, relation];
  }
  // give back what is not needed
  for (const candidate of [...best].sort((a, b) => b.nodes.length - a.nodes.length)) {
    if (stopped()) break;
    const fewer = best.filter((other) => other !== candidate);
    const relation = relationWith(fewer);
    const width = planWidth(relation, { effort });
    if (width.width <= bestPlan.width) [best, bestPlan, bestRelation] = [fewer, width, relation];
  }
  // a longer window of the same influence is made of as many new gates, and takes more of the old ones in
  for (const candidate of best) {
    for (const longer of longerOf(circuit, candidate, candidates)) {
      if (stopped()) break;
      const others = best.map((other) => (other === candidate ? longer : other));
      if (compatible(circuit, others).length < others.length) continue;
      const relation = relationWith(others);
      const width = planWidth(relation, { effort });
      if (width.width > bestPlan.width) continue;
      [best, bestPlan, bestRelation] = [others, width, relation];
      break;
    }
  }
  return {
    windows: best,
    relation: bestRelation,
    width: bestPlan,
    candidates: candidates.length,
  };
}

/** For each window, how many pairs of the whole circuit it unties when it is the only one. */
function untiedAlone(
  candidates: readonly WindowCandidate[],
  nodes: number,
  relation: Relation,
  relationWith: (chosen: readonly WindowCandidate[]) => Relation,
  stopped: () => boolean,
): Map<WindowCandidate, number> {
  const found = new Map<WindowCandidate, number>();
  const all = tiesOf(relation);
  for (const candidate of candidates.slice(0, Math.ceil(ALONE_WORK_MAX / nodes))) {
    if (stopped()) break;
    found.set(candidate, all - tiesOf(relationWith([candidate])));
  }
  return found;
}

/** Windows that hold all gates of another and `LONGER_MIN` more entanglers, with the same influence; the longest first. */
function longerOf(
  { nodes }: LifeCircuit,
  candidate: WindowCandidate,
  candidates: readonly WindowCandidate[],
): WindowCandidate[] {
  const entanglers = (window: WindowCandidate): number =>
    window.nodes.filter((node) => operationWires(nodes[node]!.operation!).length > 1).length; // windows are made of gates
  const key = (window: WindowCandidate): string => JSON.stringify([window.carriers, window.needs]);
  const [own, least] = [key(candidate), entanglers(candidate) + LONGER_MIN];
  return candidates
    .filter((other) => {
      if (entanglers(other) < least || key(other) !== own) return false;
      const held = new Set(other.nodes);
      return candidate.nodes.every((node) => held.has(node));
    })
    .sort((a, b) => entanglers(b) - entanglers(a) || a.nodes.length - b.nodes.length)
    .slice(0, LONGER_TRIED_MAX);
}

/** How many pairs of carriers a relation ties. */
function tiesOf({ rows }: Relation): number {
  return rows.reduce((sum, row) => sum + bitCount(row), 0);
}

const lengthOf = (windows: readonly WindowCandidate[]): number =>
  windows.reduce((sum, { nodes }) => sum + nodes.length, 0);

/** Takes windows in turn, as long as no gate is in two and no two wait for each other. */
function compatible(
  circuit: LifeCircuit,
  candidates: readonly WindowCandidate[],
): WindowCandidate[] {
  const taken = new Uint8Array(circuit.nodes.length);
  let chosen: WindowCandidate[] = [];
  for (const candidate of candidates) {
    if (candidate.nodes.some((node) => taken[node])) continue;
    const more = [...chosen, candidate];
    if (!contracted(circuit, more)) continue;
    chosen = more;
    for (const node of candidate.nodes) taken[node] = 1;
  }
  return chosen;
}
