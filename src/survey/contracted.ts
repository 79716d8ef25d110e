/**
 * A circuit in which windows are single nodes, in an order in which everything can happen; null when two
 * windows would have to wait for each other.
 */
import { bitsRead, bitWritten, operationWires } from '../circuit/circuit.ts';
import type { LifeCircuit, LifeNode } from './lives.ts';
import { MinimumHeap } from './minimum-heap.ts';

export type Contraction = {
  nodes: readonly number[];
  carriers: readonly number[];
  needs: readonly (readonly number[])[];
};

export function contracted(
  circuit: LifeCircuit,
  windows: readonly Contraction[],
): LifeCircuit | null {
  const { nodes } = circuit;
  // a window stands at its first node
  const standsAt = Int32Array.from(nodes, (_, node) => node);
  const windowAt = new Map<number, Contraction>();
  for (const window of windows) {
    const first = window.nodes[0]!;
    windowAt.set(first, window);
    for (const node of window.nodes) standsAt[node] = first;
  }
  const order = sorted(circuit, standsAt);
  if (!order) return null;
  const out: LifeNode[] = order.map((node) => {
    const window = windowAt.get(node);
    if (!window) return nodes[node]!;
    const { carriers, needs } = window;
    return { operation: null, end: -1, window: { carriers, needs } };
  });
  return { ...circuit, nodes: out };
}

/**
 * Representatives in an order that keeps every carrier's and bit's order, the earliest first; null on a cycle.
 */
function sorted({ lives, nodes, bits }: LifeCircuit, standsAt: Int32Array): number[] | null {
  const after: number[][] = nodes.map(() => []);
  const waits = new Int32Array(nodes.length);
  const last = new Int32Array(lives.length + bits).fill(-1);
  nodes.forEach(({ operation, end, window }, node) => {
    const here = standsAt[node]!;
    const slots = end >= 0 ? [end] : [...(window?.carriers ?? [])];
    if (operation) {
      if (end < 0) slots.push(...operationWires(operation));
      const written = bitWritten(operation);
      // readers of a bit keep their order too: simpler, and rarely matters
      for (const bit of bitsRead(operation)) slots.push(lives.length + bit);
      if (written >= 0) slots.push(lives.length + written);
    }
    for (const slot of slots) {
      const before = last[slot]!;
      if (before >= 0 && before !== here) {
        after[before]!.push(here);
        waits[here]!++;
      }
      last[slot] = here;
    }
  });
  const ready = new MinimumHeap();
  let count = 0;
  nodes.forEach((_, node) => {
    if (standsAt[node] !== node) return;
    count++;
    if (waits[node] === 0) ready.push(node);
  });
  const order: number[] = [];
  for (let node = ready.pop(); node >= 0; node = ready.pop()) {
    order.push(node);
    for (const next of after[node]!) if (--waits[next]! === 0) ready.push(next);
  }
  return order.length === count ? order : null;
}
