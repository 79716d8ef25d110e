/**
 * Finds windows: convex sets of neighbouring gates on few carriers whose influence is sparser than their
 * structure.
 *
 * For a gate and a set S of carriers around it, the window grows forward and backward along S: a gate that
 * lies in S and whose carriers are not blocked joins; any other operation blocks its carriers in S from there
 * on. A path that left the window and came back would have to pass a blocked carrier, so the window is convex:
 * its gates can happen as one.
 * Influence: `survey/influence.ts` on the window's own matrix; structure is what commutation allows inside it.
 * Cost: for each gate a few sets S, each with a 2^|S| x 2^|S| matrix and its influence table.
 */
import { operationWires } from '../circuit/circuit.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import { identity } from '../numeric/complex-matrix.ts';
import type { AxisFinder } from './axes.ts';
import { influenceFloor, influenceTables } from './influence.ts';
import type { LifeCircuit, LifeNode } from './lives.ts';
import { closureRelation } from './order.ts';
import { bitCount, inputsOf, type Relation, relationFromTable } from './relation.ts';

export type WindowCandidate = {
  /** Nodes of the circuit, ascending. */
  nodes: number[];
  /** Carriers, ascending; the first is the most significant wire of `unitary`. */
  carriers: number[];
  unitary: Float64Array;
  /** needs[k]: places in `carriers` whose input influences the output on the k-th carrier. */
  needs: number[][];
  /** Pairs that structure ties and influence does not. */
  gain: number;
};

export type WindowSearchOptions = {
  /** Most carriers of a window; 4 unless given. */
  wiresMax?: number;
  /** Most sets of carriers tried for each gate. */
  setsMax?: number;
  stopped?: () => boolean;
};

const WIRES_MAX = 4;
const SETS_MAX = 24;
/** Longer windows stop growing. */
const GATES_MAX = 200;

export function findWindows(
  circuit: LifeCircuit,
  axesOf: AxisFinder,
  options: WindowSearchOptions = {},
): WindowCandidate[] {
  const { wiresMax = WIRES_MAX, setsMax = SETS_MAX, stopped = () => false } = options;
  const lines = linesOf(circuit);
  const seen = new Set<string>();
  const found: WindowCandidate[] = [];
  circuit.nodes.forEach((node, start) => {
    if (!isGate(node) || stopped()) return;
    const own = operationWires(node.operation);
    if (own.length < 2 || own.length > wiresMax) return;
    for (const carriers of carrierSets(circuit, lines, start, wiresMax, setsMax)) {
      for (const nodes of grown(circuit, lines, start, carriers)) {
        const key = nodes.join();
        if (nodes.length < 2 || seen.has(key)) continue;
        seen.add(key);
        const candidate = measureWindow(circuit, nodes, axesOf);
        if (!candidate || candidate.gain <= 0) continue;
        found.push(candidate);
        const core = shrunk(circuit, candidate, axesOf);
        if (seen.has(core.nodes.join())) continue;
        seen.add(core.nodes.join());
        found.push(core);
      }
    }
  });
  return found;
}

export type Lines = {
  /** Nodes on each carrier, in order. */
  nodes: readonly (readonly number[])[];
  /** Place of each node on its carriers, by node and operand. */
  places: readonly (readonly number[])[];
};

export function linesOf({ lives, nodes }: LifeCircuit): Lines {
  const onCarrier: number[][] = lives.map(() => []);
  const places = nodes.map(({ operation, end, window }, node) => {
    if (end >= 0) return [];
    const carriers = window?.carriers ?? (operation ? operationWires(operation) : []);
    return carriers.map((carrier) => onCarrier[carrier]!.push(node) - 1);
  });
  return { nodes: onCarrier, places };
}

/** A gate that always happens. */
export function isGate(
  node: LifeNode,
): node is LifeNode & { operation: { kind: 'gate' } & NonNullable<LifeNode['operation']> } {
  return node.operation?.kind === 'gate' && !node.operation.condition;
}

/** The gate's own carriers, widened step by step by carriers of gates next to them. */
export function carrierSets(
  circuit: LifeCircuit,
  lines: Lines,
  start: number,
  wiresMax: number,
  setsMax: number,
): number[][] {
  const { operation } = circuit.nodes[start]!;
  const first = [...operationWires(operation!)].sort((a, b) => a - b); // a gate: checked by the caller
  const sets = new Map([[first.join(), first]]);
  let level = [first];
  for (let size = first.length; size < wiresMax && sets.size < setsMax; size++) {
    const next: number[][] = [];
    for (const set of level) {
      for (const carrier of neighbours(circuit, lines, start, set)) {
        const wider = [...set, carrier].sort((a, b) => a - b);
        if (sets.has(wider.join()) || sets.size >= setsMax) continue;
        sets.set(wider.join(), wider);
        next.push(wider);
      }
    }
    level = next;
  }
  return [...sets.values()];
}

/** Other carriers of the operations nearest to the start on the carriers of a set. */
function neighbours(
  circuit: LifeCircuit,
  lines: Lines,
  start: number,
  set: readonly number[],
): number[] {
  const found = new Set<number>();
  for (const carrier of set) {
    const line = lines.nodes[carrier]!;
    const at = placeFrom(line, start);
    for (const step of [-1, 1]) {
      // the nearest operation that leaves the set
      for (let k = at + (step < 0 ? -1 : 0); k >= 0 && k < line.length; k += step) {
        const { operation } = circuit.nodes[line[k]!]!;
        const outside = operation
          ? operationWires(operation).filter((other) => !set.includes(other))
          : [];
        if (outside.length === 0) continue;
        for (const other of outside) found.add(other);
        break;
      }
    }
  }
  return [...found].sort((a, b) => a - b);
}

/** First place on a line that is not before a node. */
function placeFrom(line: readonly number[], node: number): number {
  let [low, high] = [0, line.length];
  while (low < high) {
    const middle = (low + high) >> 1;
    if (line[middle]! < node) low = middle + 1;
    else high = middle;
  }
  return low;
}

/** All around the start, and only what comes before it or after it: gates behind a window may tie again what it leaves open. */
function grown(
  circuit: LifeCircuit,
  lines: Lines,
  start: number,
  carriers: readonly number[],
): number[][] {
  const after = growAlong(circuit, lines, start, carriers, 1, GATES_MAX);
  const before = growAlong(circuit, lines, start, carriers, -1, GATES_MAX);
  const sorted = (nodes: number[]): number[] => nodes.sort((a, b) => a - b);
  return [sorted([...before, ...after]), sorted([...before, start]), sorted(after)];
}

/** The gates from `start` on that can happen as one, in order; nodes marked in `taken` stay outside. */
export function growForward(
  circuit: LifeCircuit,
  lines: Lines,
  start: number,
  carriers: readonly number[],
  gatesMax: number,
  taken: Uint8Array,
): number[] {
  return growAlong(circuit, lines, start, carriers, 1, gatesMax, taken);
}

function growAlong(
  circuit: LifeCircuit,
  lines: Lines,
  start: number,
  carriers: readonly number[],
  step: 1 | -1,
  gatesMax: number,
  taken?: Uint8Array,
): number[] {
  const nodes: number[] = [];
  const at = carriers.map((carrier) => {
    const place = placeFrom(lines.nodes[carrier]!, start);
    return step > 0 ? place : place - 1;
  });
  const isBlocked = carriers.map(() => false);
  for (;;) {
    // the nearest node on any carrier that is still open
    let next = -1;
    carriers.forEach((carrier, k) => {
      const node = isBlocked[k] ? undefined : lines.nodes[carrier]![at[k]!];
      if (node !== undefined && (next < 0 || (node - next) * step < 0)) next = node;
    });
    if (next < 0 || nodes.length >= gatesMax) return nodes;
    const node = circuit.nodes[next]!;
    const own = node.window?.carriers ?? operationWires(node.operation!); // on a line: not an end
    const isOpen = own.every((carrier) => {
      const k = carriers.indexOf(carrier);
      return k >= 0 && !isBlocked[k];
    });
    const joins = isOpen && isGate(node) && !taken?.[next];
    if (joins) nodes.push(next);
    for (const carrier of own) {
      const k = carriers.indexOf(carrier);
      if (k < 0) continue;
      if (!joins) isBlocked[k] = true;
      at[k]! += step;
    }
  }
}

/** Takes gates off both ends of a window as long as its gain stays: what is left overlaps less with others. */
function shrunk(
  circuit: LifeCircuit,
  candidate: WindowCandidate,
  axesOf: AxisFinder,
): WindowCandidate {
  let best = candidate;
  for (let again = true; again; ) {
    again = false;
    for (const node of outermost(circuit, best.nodes)) {
      const fewer = best.nodes.filter((other) => other !== node);
      const smaller = fewer.length < 2 ? null : measureWindow(circuit, fewer, axesOf);
      if (!smaller || smaller.gain < best.gain) continue;
      best = smaller;
      again = true;
      break;
    }
  }
  return best;
}

/** Nodes of a window with none of the window before them, or none after them, on their carriers. */
function outermost(circuit: LifeCircuit, nodes: readonly number[]): number[] {
  const found = new Set<number>();
  for (const list of [nodes, [...nodes].reverse()]) {
    const met = new Set<number>();
    for (const node of list) {
      const carriers = operationWires(circuit.nodes[node]!.operation!); // windows are made of gates
      if (carriers.every((carrier) => !met.has(carrier))) found.add(node);
      for (const carrier of carriers) met.add(carrier);
    }
  }
  return [...found];
}

function measureWindow(
  circuit: LifeCircuit,
  nodes: number[],
  axesOf: AxisFinder,
): WindowCandidate | null {
  const carriers = [
    ...new Set(nodes.flatMap((node) => [...operationWires(circuit.nodes[node]!.operation!)])),
  ].sort((a, b) => a - b);
  const n = carriers.length;
  if (n < 2) return null;
  const structure = windowStructure(circuit, nodes, carriers, axesOf);
  const ties = countPairs(structure);
  if (ties === n) return null;
  const unitary = windowUnitary(circuit, nodes, carriers);
  const { kept } = influenceTables(unitary, n);
  const influence = relationFromTable(kept, n, influenceFloor(n));
  const gain = ties - countPairs(influence);
  const needs = carriers.map((_, k) => inputsOf(influence, k));
  return { nodes, carriers, unitary, needs, gain };
}

const countPairs = (relation: Relation): number =>
  relation.rows.reduce((sum, row) => sum + bitCount(row), 0);

function windowStructure(
  circuit: LifeCircuit,
  nodes: readonly number[],
  carriers: readonly number[],
  axesOf: AxisFinder,
): Relation {
  const local: LifeNode[] = nodes.map((node) => {
    const operation = circuit.nodes[node]!.operation!; // windows are made of gates
    if (operation.kind !== 'gate') return { operation, end: -1 };
    const wires = operation.wires.map((carrier) => carriers.indexOf(carrier));
    return { operation: { ...operation, wires }, end: -1 };
  });
  carriers.forEach((_, end) => {
    local.push({ operation: null, end });
  });
  const lives = carriers.map((_, k) => ({
    input: k,
    output: k,
    startsInZero: false,
    rule: 'kept' as const,
    bit: -1,
  }));
  const rules = { commute: true, early: false };
  return closureRelation({ lives, nodes: local, bits: 0, barriers: 0 }, rules, axesOf);
}

function windowUnitary(
  circuit: LifeCircuit,
  nodes: readonly number[],
  carriers: readonly number[],
): Float64Array {
  const n = carriers.length;
  const out = identity(2 ** n);
  for (const node of nodes) {
    const { operation } = circuit.nodes[node]!;
    if (operation?.kind !== 'gate') continue;
    const wires = operation.wires.map((carrier) => carriers.indexOf(carrier));
    applyGateInto(out, { ...operation, wires }, n, 2 ** n);
  }
  return out;
}
