/**
 * Chooses the windows whose reshaping lets the whole circuit do with fewer wires.
 *
 * Taking a window as one gate of which only the influence counts can only loosen the relation between carriers, so
 * compatible windows (no common gate, no cycle between them) are taken greedily, in several orders of preference; the
 * windows without which the width stays the same are given back, the longest first.
 * A plan of the whole is a nested order, so it induces one on each window: its outputs in the order in which they are
 * first needed. Each window can be factored along that order (`order`, `needs` are a plan for the chain
 * factorisation), and the whole then has the width told here.
 * Cost: linear in windows times nodes, and one width plan for each window taken.
 */
import { type GateOperation, operationWires } from '../circuit/circuit.ts';
import type { Life, LifeCircuit, LifeNode } from '../survey/lives.ts';
import { closureRelation, type OrderRules, orderGraph } from '../survey/order.ts';
import { bitCount, type Relation } from '../survey/relation.ts';
import { planWidth, type WidthPlan } from '../survey/width.ts';
import { contracted } from './contracted.ts';
import type { StructurePlan } from './structure-plan.ts';
import { findWindows, type WindowCandidate, type WindowSearchOptions } from './window-search.ts';

export type Window = WindowCandidate & {
  /** Places in `carriers`, in the order in which their outputs are first needed. */
  order: number[];
};

export type WindowPlan = {
  windows: Window[];
  /** Carriers x carriers, with the influence of the windows in place of their structure. */
  relation: Relation;
  width: WidthPlan;
  /** The width without windows. */
  structuralWidth: number;
  /** How many windows had an influence sparser than their structure. */
  candidates: number;
};

export type WindowOptions = WindowSearchOptions & {
  rules?: OrderRules;
  /** Effort for each width plan on the way, in million steps. */
  effort?: number;
};

const RULES: OrderRules = { commute: true, early: true };
const EFFORT = 5;
const EXCHANGES_MAX = 60;
/** Preferences: by gain, by few carriers, by short length, by gain for each gate. */
const PREFERENCES: readonly ((a: WindowCandidate, b: WindowCandidate) => number)[] = [
  (a, b) => b.gain - a.gain || a.nodes.length - b.nodes.length,
  (a, b) => a.carriers.length - b.carriers.length || b.gain - a.gain,
  (a, b) => b.gain / b.nodes.length - a.gain / a.nodes.length,
];

/** The fewest wires with the fewest windows found; no windows when structure does as well. */
export function planWindows(plan: StructurePlan, options: WindowOptions = {}): WindowPlan {
  const { rules = RULES, effort = EFFORT, stopped = () => false } = options;
  const { circuit, axesOf } = plan.structure;
  const candidates = findWindows(circuit, axesOf, options);
  const relationWith = (chosen: readonly WindowCandidate[]): Relation => {
    const whole = contracted(circuit, chosen);
    return closureRelation(whole ?? circuit, rules, axesOf);
  };
  let best: WindowCandidate[] = [];
  let bestPlan = plan.width;
  let bestRelation = plan.structure.relation;
  for (const preference of PREFERENCES) {
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
  left.sort((a, b) => PREFERENCES[2]!(a.candidate, b.candidate) || a.k - b.k);
  for (const { candidate } of left.slice(0, EXCHANGES_MAX)) {
    if (stopped()) break;
    if (best.includes(candidate)) continue;
    const chosen = compatible(circuit, [candidate, ...best]);
    const relation = relationWith(chosen);
    if (tiesOf(relation) > tiesOf(bestRelation)) continue;
    const width = planWidth(relation, { effort });
    if (width.width < bestPlan.width) [best, bestPlan, bestRelation] = [chosen, width, relation];
  }
  // give back what is not needed
  for (const candidate of [...best].sort((a, b) => b.nodes.length - a.nodes.length)) {
    if (stopped()) break;
    const fewer = best.filter((other) => other !== candidate);
    const relation = relationWith(fewer);
    const width = planWidth(relation, { effort });
    if (width.width <= bestPlan.width) [best, bestPlan, bestRelation] = [fewer, width, relation];
  }
  return {
    windows: withOrders(circuit, best, bestPlan.order, rules, plan),
    relation: bestRelation,
    width: bestPlan,
    structuralWidth: plan.width.width,
    candidates: candidates.length,
  };
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

/** For every window the order in which the plan first needs its outputs. */
function withOrders(
  circuit: LifeCircuit,
  chosen: readonly WindowCandidate[],
  order: readonly number[],
  rules: OrderRules,
  plan: StructurePlan,
): Window[] {
  if (chosen.length === 0) return [];
  const whole = contracted(circuit, chosen)!; // compatible windows: it exists
  const wanted = firstWanted(whole, order, rules, plan);
  return chosen.map((candidate) => {
    const node = whole.nodes.findIndex(({ window }) => window?.needs === candidate.needs);
    const times = wanted.get(node)!;
    const places = candidate.carriers.map((_, k) => k);
    return { ...candidate, order: places.sort((a, b) => times[a]! - times[b]! || a - b) };
  });
}

/** When each output of each window is first needed: a position in the order of ends. */
function firstWanted(
  circuit: LifeCircuit,
  order: readonly number[],
  rules: OrderRules,
  plan: StructurePlan,
): Map<number, number[]> {
  const { lives, nodes } = circuit;
  const graph = orderGraph(circuit, rules, plan.structure.axesOf);
  const position = new Float64Array(lives.length);
  order.forEach((end, at) => {
    position[end] = at;
  });
  const never = Number.POSITIVE_INFINITY;
  // on each carrier: wanted by what comes after the open group; within it; and by an end that may come before it
  const after = Float64Array.from(lives, (_, c) => (graph.ends[c]!.isEarly ? never : position[c]!));
  const within = new Float64Array(lives.length).fill(never);
  const firstOfGroup = new Set<string>();
  graph.groups.forEach((groups, carrier) => {
    for (const group of groups) firstOfGroup.add(`${group[0]} ${carrier}`);
  });
  const found = new Map<number, number[]>();
  for (let node = nodes.length - 1; node >= 0; node--) {
    const { operation, end, window } = nodes[node]!;
    if (end >= 0) continue;
    const carriers = window?.carriers ?? (operation ? operationWires(operation) : []);
    const times = carriers.map((carrier) => after[carrier]!);
    if (window) found.set(node, times);
    const least = Math.min(...times);
    carriers.forEach((carrier, place) => {
      const time = window
        ? Math.min(...times.filter((_, k) => window.needs[k]!.includes(place)), never)
        : least;
      within[carrier] = Math.min(within[carrier]!, time);
      if (!firstOfGroup.has(`${node} ${carrier}`)) return;
      after[carrier] = Math.min(after[carrier]!, within[carrier]!, position[carrier]!);
      within[carrier] = never;
    });
  }
  return found;
}

/** What a window has become: gates on its carriers, and the carrier on which each of its outputs then is. */
export type Replacement = {
  operations: readonly GateOperation[];
  /** places[k]: carrier of the output that was on `carriers[k]`. */
  places: readonly number[];
};

/** The plan of the circuit in which the windows are replaced. */
export function withWindows(
  plan: StructurePlan,
  windows: readonly Window[],
  replacements: readonly Replacement[],
  rules: OrderRules = RULES,
): StructurePlan {
  const { structure, original } = plan;
  const whole = contracted(structure.circuit, windows);
  if (!whole || windows.length === 0) return plan;
  const circuit = replaced(whole, windows, replacements);
  const { axesOf } = structure;
  const relation = closureRelation(circuit, rules, axesOf);
  const bitOf = (carrier: number): number => {
    const { bit, output } = circuit.lives[carrier]!;
    return bit >= 0 ? bit : original.bits + output;
  };
  const gates = windows.length === 1 ? 'one window' : `${windows.length} windows`;
  return {
    ...plan,
    structure: { ...structure, circuit, relation },
    scheduling: { circuit, relation, graph: orderGraph(circuit, rules, axesOf), bitOf },
    width: planWidth(relation),
    notes: [...plan.notes, `reshaped: ${gates} of a few gates`],
  };
}

function replaced(
  whole: LifeCircuit,
  windows: readonly Window[],
  replacements: readonly Replacement[],
): LifeCircuit {
  const lives: Life[] = whole.lives.map((life) => ({ ...life }));
  // where the qubit is now that was on each carrier
  const now = lives.map((_, carrier) => carrier);
  const nodes: LifeNode[] = [];
  for (const { operation, end, window } of whole.nodes) {
    if (window) {
      const k = windows.findIndex(({ needs }) => needs === window.needs);
      const { operations, places } = replacements[k]!;
      const here = new Map(window.carriers.map((carrier) => [carrier, now[carrier]!]));
      for (const gate of operations) {
        const wires = gate.wires.map((carrier) => here.get(carrier)!);
        nodes.push({ operation: { ...gate, wires }, end: -1 });
      }
      window.carriers.forEach((carrier, place) => {
        now[carrier] = here.get(places[place]!)!;
      });
      continue;
    }
    const moved = operation && movedTo(operation, now);
    if (end < 0) nodes.push({ operation: moved, end });
    else {
      const { output, rule, bit } = whole.lives[end]!;
      Object.assign(lives[now[end]!]!, { output, rule, bit });
      nodes.push({ operation: moved, end: now[end]! });
    }
  }
  return { ...whole, lives, nodes };
}

function movedTo(
  operation: NonNullable<LifeNode['operation']>,
  now: readonly number[],
): NonNullable<LifeNode['operation']> {
  switch (operation.kind) {
    case 'gate':
      return { ...operation, wires: operation.wires.map((carrier) => now[carrier]!) };
    case 'measure':
    case 'reset':
      return { ...operation, wire: now[operation.wire]! };
    default:
      return operation;
  }
}
