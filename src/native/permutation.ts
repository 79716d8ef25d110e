/**
 * Writes a permutation of basis states in NOT gates with none or more controls.
 *
 * Shape: to[x] is where basis state x goes, 2^n entries; wire 0 is the most significant bit.
 * Method: permutations that are affine over the bits, x -> A x + b, take CX alone: on up to `SEARCH_WIRES_MAX` wires the
 * fewest, by breadth-first search over all A; beyond, wires that only change places go round their cycles with three CX a
 * swap (arXiv:2408.07898), and others by elimination. Everything else is carried to the identity state by state, from the
 * side that is nearer (Miller, Maslov, Dueck, DAC 2003), for several orders of the wires, and the cheapest is kept.
 * Cost: 2^n * n per order, and the search once. Fails: never for a permutation.
 */
import { type GateOperation, gate } from '../circuit/circuit.ts';

/** Breadth-first search covers GL(4, 2), 20160 matrices; on 5 wires there are ten million. */
const SEARCH_WIRES_MAX = 4;
/** Orders of the wires that are tried. */
const ORDERS_MAX = 24;

/** NOT on bit `target` where all bits of the mask `controls` are 1; bit k is 2^k. */
type Flip = { controls: number; target: number };

export function permutationGates(to: Int32Array, wires: number): GateOperation[] {
  const flips = affineFlips(to, wires) ?? cheapest(to, wires);
  return flips.map(({ controls, target }) => {
    const wireOf = (bit: number): number => wires - 1 - bit;
    const own = Array.from({ length: wires }, (_, bit) => bit).filter((bit) => (controls >> bit) & 1); // biome-ignore format: one list
    const operands = [...own.map(wireOf), wireOf(target)];
    if (own.length === 0) return gate('x', operands);
    if (own.length === 1) return gate('cx', operands);
    if (own.length === 2) return gate('ccx', operands);
    return { ...gate('x', operands), controls: own.map(() => true) };
  });
}

/** CX that a NOT with this many controls takes in `decompose.ts`. */
function costOf(flips: readonly Flip[]): number {
  return flips.reduce((sum, { controls }) => {
    const count = bitCount(controls);
    return sum + (count < 2 ? count : 2 ** (count + 1) - 2);
  }, 0);
}

function bitCount(mask: number): number {
  let count = 0;
  for (let x = mask; x > 0; x &= x - 1) count++;
  return count;
}

function applied({ controls, target }: Flip, x: number): number {
  return (x & controls) === controls ? x ^ (1 << target) : x;
}

/** Flips for x -> A x + b, or undefined when the permutation is not of that kind. */
function affineFlips(to: Int32Array, wires: number): Flip[] | undefined {
  const shift = to[0]!;
  const columns = Array.from({ length: wires }, (_, bit) => to[1 << bit]! ^ shift);
  for (let x = 0; x < to.length; x++) {
    let y = shift;
    for (let bit = 0; bit < wires; bit++) if ((x >> bit) & 1) y ^= columns[bit]!;
    if (y !== to[x]) return undefined;
  }
  const nots = Array.from({ length: wires }, (_, bit) => bit)
    .filter((bit) => (shift >> bit) & 1)
    .map((target): Flip => ({ controls: 0, target }));
  const linear =
    wires <= SEARCH_WIRES_MAX
      ? searched(columns, wires)
      : (exchanged(columns, wires) ?? eliminated(columns, wires));
  return [...linear, ...nots];
}

/** The fewest CX for a linear map, by breadth-first search from the identity. */
function searched(columns: readonly number[], wires: number): Flip[] {
  // a map is its columns in one number; a CX after it changes bit `target` of each column
  const key = (list: readonly number[]): number =>
    list.reduce((sum, column) => (sum << wires) + column, 0);
  const moves: Flip[] = [];
  for (let c = 0; c < wires; c++) {
    for (let target = 0; target < wires; target++) {
      if (c !== target) moves.push({ controls: 1 << c, target });
    }
  }
  const wanted = key(columns);
  const start = columns.map((_, bit) => 1 << bit);
  const from = new Map<number, { before: number; move: Flip } | null>([[key(start), null]]);
  let front = [start];
  while (!from.has(wanted) && front.length > 0) {
    const next: number[][] = [];
    for (const list of front) {
      const before = key(list);
      for (const move of moves) {
        const moved = list.map((column) => applied(move, column));
        const place = key(moved);
        if (from.has(place)) continue;
        from.set(place, { before, move });
        next.push(moved);
      }
    }
    front = next;
  }
  const out: Flip[] = [];
  for (let step = from.get(wanted); step; step = from.get(step.before)) out.unshift(step.move);
  return out;
}

/** Wires that change places only: three CX for each swap along the cycles. */
function exchanged(columns: readonly number[], wires: number): Flip[] | undefined {
  if (columns.some((column) => bitCount(column) !== 1)) return undefined;
  // content[bit] = which input is there now; goal[bit] = which must be
  const content = columns.map((_, bit) => bit);
  const goal = new Array<number>(wires);
  columns.forEach((column, bit) => {
    goal[31 - Math.clz32(column)] = bit;
  });
  const out: Flip[] = [];
  for (let bit = 0; bit < wires; bit++) {
    const other = content.indexOf(goal[bit]!);
    if (other === bit) continue;
    const [there, back] = [
      { controls: 1 << bit, target: other },
      { controls: 1 << other, target: bit },
    ];
    out.push(there, back, there);
    [content[bit], content[other]] = [content[other]!, content[bit]!];
  }
  return out;
}

/** Gauss-Jordan elimination by rows. */
function eliminated(columns: readonly number[], wires: number): Flip[] {
  const list = [...columns];
  const undo: Flip[] = [];
  const add = (source: number, target: number): void => {
    const flip = { controls: 1 << source, target };
    for (let k = 0; k < wires; k++) list[k] = applied(flip, list[k]!);
    undo.push(flip);
  };
  for (let bit = 0; bit < wires; bit++) {
    const has = (row: number): boolean => ((list[bit]! >> row) & 1) === 1;
    if (!has(bit)) {
      for (let row = bit + 1; row < wires; row++) {
        if (!has(row)) continue;
        add(row, bit);
        break;
      }
    }
    for (let row = 0; row < wires; row++) if (row !== bit && has(row)) add(bit, row);
  }
  return undo.reverse();
}

/** The cheapest of the flips for several orders of the wires. */
function cheapest(to: Int32Array, wires: number): Flip[] {
  let best: Flip[] | undefined;
  for (const order of ordersOf(wires)) {
    const moved = new Int32Array(to.length);
    const move = (x: number): number =>
      order.reduce((sum, bit, k) => sum + (((x >> bit) & 1) << k), 0);
    for (let x = 0; x < to.length; x++) moved[move(x)] = move(to[x]!);
    const flips = towardsIdentity(moved, wires).map(({ controls, target }) => ({
      controls: order.reduce((sum, bit, k) => sum + (((controls >> k) & 1) << bit), 0),
      target: order[target]!,
    }));
    if (!best || costOf(flips) < costOf(best)) best = flips;
  }
  return best!; // there is at least one order
}

/** All orders while there are few, else the rotations and their reversals. */
function ordersOf(wires: number): number[][] {
  const all = Array.from({ length: wires }, (_, k) => k);
  let list: number[][] = [[]];
  for (let k = 0; k < wires && list.length <= ORDERS_MAX; k++) {
    list = list.flatMap((order) =>
      all.filter((bit) => !order.includes(bit)).map((bit) => [...order, bit]),
    );
  }
  if (list.length <= ORDERS_MAX && list[0]!.length === wires) return list;
  const turned = all.map((k) => all.map((bit) => (bit + k) % wires));
  return [...turned, ...turned.map((order) => order.slice().reverse())];
}

function towardsIdentity(to: Int32Array, wires: number): Flip[] {
  const f = to.slice();
  const back = new Int32Array(f.length);
  const invert = (): void => {
    for (let x = 0; x < f.length; x++) back[f[x]!] = x;
  };
  const after: Flip[] = [];
  const before: Flip[] = [];
  for (let x = 0; x < f.length; x++) {
    invert();
    const atOutput = bitCount(f[x]! ^ x) <= bitCount(back[x]! ^ x);
    const steps = stepsTo(x, atOutput ? f[x]! : back[x]!, wires);
    for (const flip of steps) {
      if (atOutput) {
        for (let k = 0; k < f.length; k++) f[k] = applied(flip, f[k]!);
        after.push(flip);
      } else {
        // f after the flip: entries change places
        const moved = f.map((_, k) => f[applied(flip, k)]!);
        f.set(moved);
        before.push(flip);
      }
    }
  }
  // after_k .. after_1 f before_1 .. before_m = 1
  return [...before, ...after.reverse()];
}

/** Flips that carry y to x and leave every state below x alone, where y >= x. */
function stepsTo(x: number, y: number, wires: number): Flip[] {
  const out: Flip[] = [];
  let now = y;
  for (let bit = 0; bit < wires; bit++) {
    const mask = 1 << bit;
    if (!(x & mask) || now & mask) continue;
    out.push({ controls: now, target: bit });
    now |= mask;
  }
  for (let bit = 0; bit < wires; bit++) {
    const mask = 1 << bit;
    if (!(now & mask) || x & mask) continue;
    out.push({ controls: x, target: bit });
    now &= ~mask;
  }
  return out;
}
