/**
 * Plans a circuit with windows to be reshaped, and takes in what the windows have become.
 *
 * A plan of the whole is a nested order, so it induces one on each window: its outputs in the order in which
 * they are first needed. Each window can be factored along that order (`order`, `needs` are a plan for the
 * chain factorisation), and the whole then has the width told here.
 * To use it: `planStructure`, `planWindows`, make gates of each window, `withWindows`, and go on as with any
 * plan.
 */
import { type GateOperation, moved, operationWires } from '../circuit/circuit.ts';
import { contracted } from '../survey/contracted.ts';
import type { Life, LifeCircuit, LifeNode } from '../survey/lives.ts';
import { closureRelation, type OrderRules, orderGraph } from '../survey/order.ts';
import { planWidth } from '../survey/width.ts';
import type { WindowCandidate } from '../survey/window-search.ts';
import {
  chooseWindows,
  WINDOW_RULES,
  type WindowChoice,
  type WindowOptions,
} from '../survey/windows.ts';
import type { StructurePlan } from './structure-plan.ts';

export type Window = WindowCandidate & {
  /** Places in `carriers`, in the order in which their outputs are first needed. */
  order: number[];
};

export type WindowPlan = Omit<WindowChoice, 'windows'> & {
  windows: Window[];
  /** The width without windows. */
  structuralWidth: number;
};

/** The fewest wires with the fewest windows found; no windows when structure does as well. */
export function planWindows(plan: StructurePlan, options: WindowOptions = {}): WindowPlan {
  const { rules = WINDOW_RULES } = options;
  const choice = chooseWindows(plan.structure, plan.width, options);
  const { circuit } = plan.structure;
  return {
    ...choice,
    windows: withOrders(circuit, choice.windows, choice.width.order, rules, plan),
    structuralWidth: plan.width.width,
  };
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
  // on each carrier: wanted by what comes after the open group; within it; and by an end that may come before
  // it
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
  rules: OrderRules = WINDOW_RULES,
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
    const here = operation && moved(operation, (carrier) => now[carrier]!);
    if (end < 0) nodes.push({ operation: here, end });
    else {
      const { output, rule, bit } = whole.lives[end]!;
      Object.assign(lives[now[end]!]!, { output, rule, bit });
      nodes.push({ operation: here, end: now[end]! });
    }
  }
  return { ...whole, lives, nodes };
}
