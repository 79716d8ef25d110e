/**
 * Writes gates on two wires so that only linked wires meet.
 *
 * Shape: CX, CZ and unitaries on two wires, and gates on one wire; the result is the same unitary.
 * Method: a CX between wires at distance k goes along the path between them: with L the CX from each wire of the path to
 * the next, in the order from the target back to the control, L and its inverse on all but the last link leave the control's bit
 * at the target, 4 (k - 1) CX for k > 1. A unitary is carried next to its partner by swaps, and back.
 * Paths are shortest, by breadth-first search; ties go to the lower wire.
 */
import { type GateOperation, gate } from '../circuit/circuit.ts';
import type { Pair } from '../reshape/placement-beam.ts';

export function goRound(
  operations: readonly GateOperation[],
  links: readonly Pair[],
  wires: number,
): GateOperation[] {
  if (links.length === (wires * (wires - 1)) / 2) return [...operations];
  const isLinked = (a: number, b: number): boolean =>
    links.some(([p, q]) => (p === a && q === b) || (p === b && q === a));
  return operations.flatMap((operation) => {
    const [a, b] = operation.wires;
    if (b === undefined || isLinked(a!, b)) return [operation];
    const path = pathBetween(a!, b, links, wires);
    switch (operation.name) {
      case 'cx':
        return ladder(path);
      case 'cz':
        return [gate('h', [b]), ...ladder(path), gate('h', [b])];
      default:
        return carried(operation, path);
    }
  });
}

/** The links between these wires, renumbered in their order. */
export function linksWithin(links: readonly Pair[], of: readonly number[]): Pair[] {
  return links.flatMap(([a, b]): Pair[] => {
    const [p, q] = [of.indexOf(a), of.indexOf(b)];
    return p < 0 || q < 0 ? [] : [[p, q]];
  });
}

/** Whether the links hold the wires 0 .. wires-1 together. */
export function isConnected(links: readonly Pair[], wires: number): boolean {
  const reached = new Set([0]);
  for (let before = 0; reached.size > before; ) {
    before = reached.size;
    for (const [a, b] of links) {
      if (reached.has(a)) reached.add(b);
      else if (reached.has(b)) reached.add(a);
    }
  }
  return reached.size >= wires;
}

/** CX from the first to the last wire of the path. */
function ladder(path: readonly number[]): GateOperation[] {
  const steps = path.slice(1).map((wire, k) => gate('cx', [path[k]!, wire]));
  // up: from the far end to the near one and back; down: the same without the last link
  const up = [...steps.slice().reverse(), ...steps.slice(1)];
  const down = [...steps.slice(0, -1).reverse(), ...steps.slice(1, -1)];
  return [...up, ...down];
}

function carried(operation: GateOperation, path: readonly number[]): GateOperation[] {
  const [near] = path.slice(-2);
  const swaps = path.slice(1, -1).map((wire, k) => gate('swap', [path[k]!, wire]));
  const inner = { ...operation, wires: [near!, path[path.length - 1]!] };
  return [...swaps, inner, ...swaps.slice().reverse()];
}

function pathBetween(a: number, b: number, links: readonly Pair[], wires: number): number[] {
  const before = new Array<number>(wires).fill(-1);
  before[a] = a;
  const queue = [a];
  for (const wire of queue) {
    for (let next = 0; next < wires; next++) {
      const isNeighbour = links.some(
        ([p, q]) => (p === wire && q === next) || (q === wire && p === next),
      );
      if (!isNeighbour || before[next] !== -1) continue;
      before[next] = wire;
      queue.push(next);
    }
  }
  const path = [b];
  while (path[0] !== a) path.unshift(before[path[0]!]!);
  return path;
}
