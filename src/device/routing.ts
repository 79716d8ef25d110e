/**
 * Makes a circuit respect the links of a device by inserting swaps.
 *
 * Method: lookahead swap search in the manner of Li, Ding, Xie (ASPLOS 2019, arXiv:1809.02573): gates whose wires
 * are linked are done at once; when none is left, the swap is inserted that lowers the summed distance of the
 * waiting gates and, with less weight, of those that come after. Distances are shortest paths whose edge lengths
 * are the cost of a swap on the link, -3 ln(process fidelity of the entangler), or 1 where no errors are given.
 * Changed: ties go to the lower pair of wires, so that the answer is always the same; after a number of swaps
 * without a gate done the nearest waiting gate is brought together along its shortest path, so it always ends.
 * Wires of the device that carry nothing take part in swaps like any other (they stay in |0> or are reset).
 * Fails: InputError `not-connected` when the device's links do not connect the wires that must meet, and
 * `too-many-wires` when the circuit is larger than the device; gates on three wires or more are refused.
 * Cost: about (gates) x (links) x (lookahead).
 */
import { type Circuit, gate, moved, type Operation, operationWires } from '../circuit/circuit.ts';
import { dependencyGraph } from '../circuit/graph.ts';
import { InputError } from '../input-error.ts';
import type { Device } from './device.ts';

/** How many gates beyond the waiting ones are looked at, and what each counts. */
const LOOKAHEAD_MAX = 20;
const LOOKAHEAD_WEIGHT = 0.5;

export type Routed = {
  /** On the device's wires: the circuit's wire numbers are the device's. */
  circuit: Circuit;
  /** Device wire under each wire of the original at the start, and at the end. */
  placement: readonly number[];
  finalPlacement: readonly number[];
  swaps: number;
};

/** All-pairs shortest distances over links, and which linked wires each has. */
export type LinkMap = {
  size: number;
  distance: Float64Array;
  neighbours: readonly (readonly number[])[];
};

export function linkMap(device: Device): LinkMap {
  const size = device.wires.length;
  const neighbours: number[][] = Array.from({ length: size }, () => []);
  const length = new Map<number, number>();
  const hasErrors = device.links.some(({ error }) => error !== undefined);
  for (const { between, error } of device.links) {
    const [a, b] = between;
    if (!neighbours[a]!.includes(b)) neighbours[a]!.push(b);
    if (!neighbours[b]!.includes(a)) neighbours[b]!.push(a);
    const fidelity = Math.max(1e-6, 1 - 1.25 * (error ?? 0));
    // a small constant keeps perfect links from being free, so that paths stay short
    const cost = hasErrors ? -3 * Math.log(fidelity) + 1e-4 : 1;
    length.set(a * size + b, cost);
    length.set(b * size + a, cost);
  }
  for (const list of neighbours) list.sort((a, b) => a - b);
  const distance = new Float64Array(size * size).fill(Number.POSITIVE_INFINITY);
  for (let source = 0; source < size; source++)
    shortestFrom(source, size, neighbours, length, distance);
  return { size, distance, neighbours };
}

/** Dijkstra (Numerische Mathematik 1, 269 (1959)), without a heap: devices have some hundred wires. */
function shortestFrom(
  source: number,
  size: number,
  neighbours: readonly (readonly number[])[],
  length: ReadonlyMap<number, number>,
  distance: Float64Array,
): void {
  const row = source * size;
  const done = new Uint8Array(size);
  distance[row + source] = 0;
  for (let round = 0; round < size; round++) {
    let next = -1;
    for (let w = 0; w < size; w++) {
      if (!done[w] && (next < 0 || distance[row + w]! < distance[row + next]!)) next = w;
    }
    if (next < 0 || distance[row + next] === Number.POSITIVE_INFINITY) return;
    done[next] = 1;
    for (const w of neighbours[next]!) {
      const through = distance[row + next]! + length.get(next * size + w)!;
      if (through < distance[row + w]!) distance[row + w] = through;
    }
  }
}

/** Routes a circuit of gates on at most two wires from a given placement. */
export function routeCircuit(
  circuit: Circuit,
  device: Device,
  placement: readonly number[],
  links: LinkMap = linkMap(device),
): Routed {
  const run = new Routing(circuit, links, placement);
  run.finish();
  return {
    circuit: {
      ...circuit,
      wires: links.size,
      qubitRegisters: [{ name: 'q', first: 0, size: links.size, scalar: false }],
      operations: run.out,
    },
    placement: [...placement],
    finalPlacement: run.place.slice(0, circuit.wires),
    swaps: run.swaps,
  };
}

/** One routing: what waits, where every wire is, what was written. */
class Routing {
  readonly out: Operation[] = [];
  /** Device wire of each wire of the circuit. */
  readonly place: number[];
  swaps = 0;
  /** Circuit wire on each device wire, -1 where there is none. */
  private readonly content: Int32Array;
  private readonly waitingFor: Int32Array;
  private readonly after: number[][];
  private front: number[] = [];
  private readonly operations: readonly Operation[];
  private readonly links: LinkMap;

  constructor(circuit: Circuit, links: LinkMap, placement: readonly number[]) {
    if (circuit.wires > links.size) {
      throw new InputError({
        code: 'too-many-wires',
        message: `the circuit has ${circuit.wires} wires, the device ${links.size}`,
      });
    }
    this.operations = circuit.operations;
    this.links = links;
    this.place = [...placement];
    this.content = new Int32Array(links.size).fill(-1);
    placement.forEach((site, wire) => {
      this.content[site] = wire;
    });
    const graph = dependencyGraph(circuit);
    this.waitingFor = new Int32Array(graph.size);
    this.after = Array.from({ length: graph.size }, () => []);
    for (let k = 0; k < graph.size; k++) {
      const { line, column } = this.operations[k]!;
      const large =
        this.operations[k]!.kind === 'gate' && operationWires(this.operations[k]!).length > 2;
      if (large) {
        throw new InputError({
          code: 'gate-too-large',
          message: 'expected gates on at most two wires for placement, got a larger one',
          ...(line === undefined ? {} : { line }),
          ...(column === undefined ? {} : { column }),
        });
      }
      for (let i = graph.start[k]!; i < graph.start[k + 1]!; i++)
        this.after[graph.before[i]!]!.push(k);
      this.waitingFor[k] = graph.start[k + 1]! - graph.start[k]!;
      if (this.waitingFor[k] === 0) this.front.push(k);
    }
  }

  finish(): void {
    let sinceProgress = 0;
    let previous = -1;
    while (this.front.length > 0) {
      if (this.doReady()) {
        sinceProgress = 0;
        previous = -1;
        continue;
      }
      if (sinceProgress > 2 * this.links.size) {
        this.bringTogether(this.front[0]!);
        sinceProgress = 0;
        continue;
      }
      previous = this.bestSwap(previous);
      sinceProgress++;
    }
  }

  private isReady(k: number): boolean {
    const wires = operationWires(this.operations[k]!);
    if (this.operations[k]!.kind === 'barrier' || wires.length < 2) return true;
    return this.links.neighbours[this.place[wires[0]!]!]!.includes(this.place[wires[1]!]!);
  }

  /** Writes every operation that can be done where things are; true when there was one. */
  private doReady(): boolean {
    let any = false;
    const waiting: number[] = [];
    for (let i = 0; i < this.front.length; i++) {
      const k = this.front[i]!;
      if (!this.isReady(k)) {
        waiting.push(k);
        continue;
      }
      any = true;
      this.out.push(moved(this.operations[k]!, (wire) => this.place[wire]!));
      for (const next of this.after[k]!) if (--this.waitingFor[next]! === 0) this.front.push(next);
    }
    this.front = waiting.sort((a, b) => a - b);
    return any;
  }

  private gap(k: number): number {
    const [a, b] = operationWires(this.operations[k]!);
    return this.links.distance[this.place[a!]! * this.links.size + this.place[b!]!]!;
  }

  /** The two-wire operations that come next after the front, nearest first. */
  private lookahead(): number[] {
    const found: number[] = [];
    const seen = new Set(this.front);
    const queue = [...this.front];
    for (let i = 0; i < queue.length && found.length < LOOKAHEAD_MAX; i++) {
      for (const next of this.after[queue[i]!]!) {
        if (seen.has(next)) continue;
        seen.add(next);
        queue.push(next);
        const operation = this.operations[next]!;
        if (operation.kind === 'gate' && operation.wires.length === 2) found.push(next);
      }
    }
    return found;
  }

  private bestSwap(previous: number): number {
    for (const k of this.front) if (this.gap(k) === Number.POSITIVE_INFINITY) throw notConnected();
    const ahead = this.lookahead();
    const cost = (): number => {
      let near = 0;
      for (const k of this.front) near += this.gap(k);
      let far = 0;
      for (const k of ahead) far += this.gap(k);
      const weight = ahead.length > 0 ? LOOKAHEAD_WEIGHT / ahead.length : 0;
      return near / this.front.length + weight * far;
    };
    const sites = new Set<number>();
    for (const k of this.front) {
      for (const wire of operationWires(this.operations[k]!)) sites.add(this.place[wire]!);
    }
    let best = { cost: Number.POSITIVE_INFINITY, a: -1, b: -1 };
    for (const site of [...sites].sort((a, b) => a - b)) {
      for (const other of this.links.neighbours[site]!) {
        const [a, b] = site < other ? [site, other] : [other, site];
        if (a * this.links.size + b === previous) continue;
        this.exchange(a, b);
        const here = cost();
        this.exchange(a, b);
        const isBetter = here < best.cost - 1e-12;
        const isTie =
          Math.abs(here - best.cost) <= 1e-12 && (a < best.a || (a === best.a && b < best.b));
        if (isBetter || isTie) best = { cost: here, a, b };
      }
    }
    if (best.a < 0) {
      this.bringTogether(this.front[0]!);
      return -1;
    }
    this.swap(best.a, best.b);
    return best.a * this.links.size + best.b;
  }

  /** Swaps one operand along its shortest path until the two are linked. */
  private bringTogether(k: number): void {
    const [first, second] = operationWires(this.operations[k]!);
    const { size, distance, neighbours } = this.links;
    while (!this.isReady(k)) {
      const from = this.place[first!]!;
      const to = this.place[second!]!;
      if (distance[from * size + to] === Number.POSITIVE_INFINITY) throw notConnected();
      const next = neighbours[from]!.reduce((best, site) =>
        distance[site * size + to]! < distance[best * size + to]! ? site : best,
      );
      this.swap(from, next);
    }
  }

  private exchange(a: number, b: number): void {
    const [x, y] = [this.content[a]!, this.content[b]!];
    this.content[a] = y;
    this.content[b] = x;
    if (x >= 0) this.place[x] = b;
    if (y >= 0) this.place[y] = a;
  }

  private swap(a: number, b: number): void {
    this.exchange(a, b);
    this.out.push(gate('swap', [a, b]));
    this.swaps++;
  }
}

function notConnected(): InputError {
  return new InputError({
    code: 'not-connected',
    message: 'expected links that connect the wires of every two-wire gate, got a device in pieces',
  });
}
