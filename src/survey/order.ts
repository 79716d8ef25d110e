/**
 * The order that operations on carriers really need: those that commute on every shared carrier have none.
 *
 * On each carrier the operations form groups, one after the other; those within a group share an axis
 * (`axes.ts`) and commute, each group waits for the one before it. Bits add edges: a reader waits for the
 * writer, and a writer for earlier writers and readers.
 * Early measurement: a measured end has axis z, so it may come as soon as all groups before the last one are
 * done when that last group has axis z; what is left of the group becomes conditions on the bit. (The
 * deferred-measurement principle read backwards; Nielsen, Chuang, section 4.4; Griffiths, Niu, PRL 76, 3228
 * (1996).)
 * Closure: what the end of a carrier needs is every carrier touched by the operations that must come before it.
 * Cost: linear in operations, times lives / 32 words for the closures.
 */
import { bitsRead, bitWritten, operationWires } from '../circuit/circuit.ts';
import { type Axis, type AxisFinder, axisFinder, isZ, sameAxis, Z_AXIS } from './axes.ts';
import type { LifeCircuit } from './lives.ts';
import { emptyRelation, type Relation } from './relation.ts';

export type OrderRules = {
  /** Gates that commute have no order. */
  commute: boolean;
  /** Measured outputs may leave before the gates that they only control. */
  early: boolean;
};

type Visit = {
  /** An operation, its carriers, and for each whether it opens a new group there. */
  operation(node: number, carriers: readonly number[], opensGroup: readonly boolean[]): void;
  end(node: number, carrier: number, isEarly: boolean): void;
};

function walkGroups(
  circuit: LifeCircuit,
  rules: OrderRules,
  axesOf: AxisFinder,
  visit: Visit,
): void {
  const { lives, nodes } = circuit;
  const lastOther = rules.commute ? null : lastNonZ(circuit, axesOf);
  const open: (Axis | undefined)[] = new Array(lives.length).fill(undefined);
  /** Per carrier: its open group holds a measurement. */
  const measures = new Uint8Array(lives.length);
  const lastWriter = new Int32Array(circuit.bits).fill(-1);
  nodes.forEach(({ operation }, node) => {
    const written = operation ? bitWritten(operation) : -1;
    if (written >= 0) lastWriter[written] = node;
  });
  nodes.forEach(({ operation, end, window }, node) => {
    if (end >= 0) {
      const axis = open[end];
      const { rule, bit } = lives[end]!;
      // what is left over becomes conditions on the bit: it must keep its value, and only gates can be
      // conditioned
      const isKept = bit < 0 || lastWriter[bit] === node;
      const isEarly = rule === 'measured' && isKept && !measures[end] && axis !== undefined;
      visit.end(node, end, rules.early && isEarly && isZ(axis));
      return;
    }
    const carriers = window?.carriers ?? (operation ? operationWires(operation) : []);
    if (!operation && !window) return;
    // what a window becomes is not known yet: it commutes with nothing
    const axes: readonly Axis[] = operation ? axesOf(operation) : carriers.map(() => 'none');
    const opensGroup = carriers.map((carrier, place) => {
      const axis = axes[place]!;
      const group = open[carrier];
      const mayJoin = rules.commute || (rules.early && node > lastOther![carrier]!);
      const joins = group !== undefined && mayJoin && sameAxis(group, axis);
      if (!joins || group === 'all') open[carrier] = axis;
      if (!joins) measures[carrier] = 0;
      if (operation?.kind === 'measure') measures[carrier] = 1;
      return !joins;
    });
    visit.operation(node, carriers, opensGroup);
  });
}

/** The last node on each carrier that is not a mere control or phase there. */
function lastNonZ({ lives, nodes }: LifeCircuit, axesOf: AxisFinder): Int32Array {
  const out = new Int32Array(lives.length).fill(-1);
  nodes.forEach(({ operation, end }, node) => {
    if (!operation || end >= 0) return;
    const axes = axesOf(operation);
    operationWires(operation).forEach((carrier, place) => {
      if (!sameAxis(axes[place]!, Z_AXIS)) out[carrier] = node;
    });
  });
  return out;
}

/** Which carriers must have entered before the end of each carrier: lives x lives. */
export function closureRelation(
  circuit: LifeCircuit,
  rules: OrderRules,
  axesOf: AxisFinder = axisFinder(),
): Relation {
  const { lives, bits } = circuit;
  const relation = emptyRelation(lives.length, lives.length);
  const words = relation.rows[0]?.length ?? 0;
  // per carrier: needed by all groups before the open one, and with the open one
  const before = lives.map(() => new Uint32Array(words));
  const withOpen = lives.map(() => new Uint32Array(words));
  lives.forEach((_, carrier) => {
    before[carrier]![carrier >> 5]! |= 1 << (carrier & 31);
    withOpen[carrier]!.set(before[carrier]!);
  });
  const written = bitSets(bits, words);
  const used = bitSets(bits, words);
  const closure = new Uint32Array(words);
  walkGroups(circuit, rules, axesOf, {
    operation(node, carriers, opensGroup) {
      const { window } = circuit.nodes[node]!;
      if (window) {
        for (const carrier of carriers) before[carrier]!.set(withOpen[carrier]!);
        window.needs.forEach((places, k) => {
          const out = withOpen[carriers[k]!]!;
          out.fill(0);
          for (const place of places) unite(out, before[carriers[place]!]!);
        });
        return;
      }
      closure.fill(0);
      carriers.forEach((carrier, k) => {
        if (opensGroup[k]) before[carrier]!.set(withOpen[carrier]!);
        unite(closure, before[carrier]!);
      });
      settleBits(circuit, node, closure, written, used);
      for (const carrier of carriers) unite(withOpen[carrier]!, closure);
    },
    end(node, carrier, isEarly) {
      closure.set(isEarly ? before[carrier]! : withOpen[carrier]!);
      settleBits(circuit, node, closure, written, used);
      relation.rows[carrier]!.set(closure);
    },
  });
  return relation;
}

function bitSets(bits: number, words: number): Uint32Array[] {
  return Array.from({ length: bits }, () => new Uint32Array(words));
}

function unite(into: Uint32Array, from: Uint32Array): void {
  for (let w = 0; w < into.length; w++) into[w]! |= from[w]!;
}

function settleBits(
  { nodes }: LifeCircuit,
  node: number,
  closure: Uint32Array,
  written: Uint32Array[],
  used: Uint32Array[],
): void {
  const { operation } = nodes[node]!;
  if (!operation) return;
  const read = bitsRead(operation);
  const target = bitWritten(operation);
  for (const bit of read) unite(closure, written[bit]!);
  if (target >= 0) {
    unite(closure, written[target]!);
    unite(closure, used[target]!);
    written[target]!.set(closure);
    used[target]!.fill(0);
  }
  for (const bit of read) if (bit !== target) unite(used[bit]!, closure);
}

/** The same order as explicit groups and edges, for scheduling. */
export type OrderGraph = {
  /** groups[carrier]: lists of nodes, in order; the end of the carrier is in none of them. */
  groups: readonly (readonly (readonly number[])[])[];
  /** Node of the end of each carrier, and whether it may come before the last group. */
  ends: readonly { node: number; isEarly: boolean }[];
  /** Nodes that wait for each node because of bits. */
  afterByBits: ReadonlyMap<number, readonly number[]>;
};

export function orderGraph(
  circuit: LifeCircuit,
  rules: OrderRules,
  axesOf: AxisFinder = axisFinder(),
): OrderGraph {
  const groups: number[][][] = circuit.lives.map(() => []);
  const ends: { node: number; isEarly: boolean }[] = circuit.lives.map(() => ({
    node: -1,
    isEarly: false,
  }));
  walkGroups(circuit, rules, axesOf, {
    operation(node, carriers, opensGroup) {
      carriers.forEach((carrier, k) => {
        if (opensGroup[k]) groups[carrier]!.push([]);
        groups[carrier]!.at(-1)!.push(node);
      });
    },
    end(node, carrier, isEarly) {
      ends[carrier] = { node, isEarly };
    },
  });
  return { groups, ends, afterByBits: bitEdges(circuit) };
}

function bitEdges({ nodes, bits }: LifeCircuit): Map<number, number[]> {
  const after = new Map<number, number[]>();
  const writer = new Int32Array(bits).fill(-1);
  const readers: number[][] = Array.from({ length: bits }, () => []);
  const link = (from: number, to: number): void => {
    const list = after.get(from);
    if (!list) after.set(from, [to]);
    else if (list.at(-1) !== to) list.push(to);
  };
  nodes.forEach(({ operation }, node) => {
    if (!operation) return;
    const read = bitsRead(operation);
    const target = bitWritten(operation);
    for (const bit of read) if (writer[bit]! >= 0) link(writer[bit]!, node);
    if (target >= 0) {
      if (writer[target]! >= 0) link(writer[target]!, node);
      for (const reader of readers[target]!) link(reader, node);
      readers[target] = [];
      writer[target] = node;
    }
    for (const bit of read) if (bit !== target) readers[bit]!.push(node);
  });
  return after;
}
