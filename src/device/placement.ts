/**
 * Chooses the wires of a device on which a circuit runs best.
 *
 * Method: (1) embeddings in which every interacting pair is linked are searched by backtracking, most connected
 * wire first; (2) where there are none, or besides them, greedy placements grown from every wire of the device.
 * Every candidate is routed (`routing.ts`) and judged by the success estimate (`estimate.ts`), or by the number of
 * swaps and then entangler depth where the device gives no errors. Ties go to the candidate found first, and the
 * order of the search is fixed.
 * Cost: candidates x routing. Limits: `CANDIDATES_MAX` candidates, `EMBEDDING_STEPS_MAX` steps of backtracking;
 * a good embedding may be missed beyond, never a valid circuit.
 */
import type { Circuit } from '../circuit/circuit.ts';
import type { Device } from './device.ts';
import { type Estimate, estimateSuccess, identityPlacement } from './estimate.ts';
import { type LinkMap, linkMap, type Routed, routeCircuit } from './routing.ts';

const CANDIDATES_MAX = 200;
const EMBEDDING_STEPS_MAX = 200_000;

export type Placed = Routed & { estimate: Estimate };

/** The best placement found, routed; its estimate is that of the routed circuit. */
export function placeCircuit(circuit: Circuit, device: Device): Placed {
  const links = linkMap(device);
  const weights = interactions(circuit);
  let best: Placed | undefined;
  for (const placement of candidates(circuit.wires, weights, links)) {
    const routed = routeCircuit(circuit, device, placement, links);
    const estimate = estimateSuccess(routed.circuit, device, identityPlacement(routed.circuit));
    if (!best || isBetter({ ...routed, estimate }, best)) best = { ...routed, estimate };
  }
  if (best) return best;
  const routed = routeCircuit(circuit, device, identityPlacement(circuit), links);
  return { ...routed, estimate: estimateSuccess(routed.circuit, device) };
}

function isBetter(a: Placed, b: Placed): boolean {
  const difference = a.estimate.success - b.estimate.success;
  if (Math.abs(difference) > 1e-12) return difference > 0;
  return a.swaps < b.swaps;
}

/** How often each pair of wires meets: weights[a * n + b]. */
function interactions({ wires: n, operations }: Circuit): Float64Array {
  const weights = new Float64Array(n * n);
  for (const operation of operations) {
    if (operation.kind !== 'gate' || operation.wires.length !== 2) continue;
    const [a, b] = operation.wires as [number, number];
    weights[a * n + b]! += 1;
    weights[b * n + a]! += 1;
  }
  return weights;
}

function candidates(n: number, weights: Float64Array, links: LinkMap): number[][] {
  if (n === 0 || n > links.size) return [];
  const order = connectedOrder(n, weights);
  const found = embeddings(n, order, weights, links);
  for (let site = 0; site < links.size && found.length < CANDIDATES_MAX; site++) {
    const placement = greedyFrom(site, n, order, weights, links);
    if (placement) found.push(placement);
  }
  return found;
}

/** Wires so that each is as tied as possible to those before it; the most tied one first. */
function connectedOrder(n: number, weights: Float64Array): number[] {
  const order: number[] = [];
  const taken = new Uint8Array(n);
  while (order.length < n) {
    let best = -1;
    let bestTie = -1;
    for (let w = 0; w < n; w++) {
      if (taken[w]) continue;
      let inside = 0;
      let total = 0;
      for (let v = 0; v < n; v++) {
        total += weights[w * n + v]!;
        if (taken[v]) inside += weights[w * n + v]!;
      }
      const tie = inside * 1e6 + total;
      if (tie > bestTie) {
        best = w;
        bestTie = tie;
      }
    }
    order.push(best);
    taken[best] = 1;
  }
  return order;
}

function embeddings(
  n: number,
  order: readonly number[],
  weights: Float64Array,
  links: LinkMap,
): number[][] {
  const found: number[][] = [];
  const place = new Array<number>(n).fill(-1);
  const used = new Uint8Array(links.size);
  let steps = 0;
  const extend = (depth: number): void => {
    if (depth === n) {
      found.push([...place]);
      return;
    }
    const wire = order[depth]!;
    const partners = order.slice(0, depth).filter((other) => weights[wire * n + other]! > 0);
    const sites =
      partners.length > 0
        ? links.neighbours[place[partners[0]!]!]!
        : Array.from({ length: links.size }, (_, site) => site);
    for (const site of sites) {
      if (found.length >= CANDIDATES_MAX / 2 || ++steps > EMBEDDING_STEPS_MAX) return;
      if (used[site]) continue;
      const isLinked = partners.every((other) => links.neighbours[site]!.includes(place[other]!));
      if (!isLinked) continue;
      place[wire] = site;
      used[site] = 1;
      extend(depth + 1);
      used[site] = 0;
      place[wire] = -1;
    }
  };
  // backtracking is as deep as the circuit has wires
  if (n <= 500) extend(0);
  return found;
}

function greedyFrom(
  start: number,
  n: number,
  order: readonly number[],
  weights: Float64Array,
  { size, distance }: LinkMap,
): number[] | undefined {
  const place = new Array<number>(n).fill(-1);
  const used = new Uint8Array(size);
  for (const [depth, wire] of order.entries()) {
    let best = -1;
    let bestCost = Number.POSITIVE_INFINITY;
    for (let site = 0; site < size; site++) {
      if (used[site] || (depth === 0 && site !== start)) continue;
      let cost = 0;
      for (const other of order.slice(0, depth)) {
        // wires that never meet should still stay near each other
        const weight = weights[wire * n + other]! + 1e-3;
        cost += weight * distance[site * size + place[other]!]!;
      }
      if (cost < bestCost) {
        best = site;
        bestCost = cost;
      }
    }
    if (best < 0) return undefined;
    place[wire] = best;
    used[best] = 1;
  }
  return place;
}
