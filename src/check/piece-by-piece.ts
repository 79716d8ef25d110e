/**
 * Proves two circuits of any size equal by taking equal pieces from the front of both until nothing is left.
 *
 * Method: for a set of few lines, the gates at the front of each list that act within the set and wait for nothing outside of it
 * are a beginning of the circuit. Both beginnings are applied gate by gate to one random state; where the states agree up to a
 * phase the gates up to there are compared as matrices, and taken out of both. Sets start from a gate at the front and grow by
 * the lines of the gates that block them. So every local rewriting is undone, however many there are, at a cost that grows
 * with the number of gates and not with that of lines; windows that `narrow` reshapes are of this kind.
 * A piece may also leave its lines in another order, as windows do that let an output leave on another line; from there on the
 * lines of the second list go by the names of the first one's. Swaps are such a change of names and nothing else.
 * Proves: the same, with D at most 1 - cos(sum of the angles between the pieces); it never proves a difference.
 * Fails: null when no set of at most `LINES_MAX` lines has equal beginnings any more, or the lists are too long.
 */
import { applyMatrixInto } from '../circuit/unitary.ts';
import { identity, innerProduct, normSquared } from '../numeric/complex-matrix.ts';
import { distanceAngle, hilbertSchmidtDistance } from '../numeric/distance.ts';
import { normal, random } from '../numeric/random.ts';
import type { LineGate } from './lines.ts';
import type { Sides } from './sides.ts';

const LINES_MAX = 6;
/** Other orders of the lines are tried for pieces of at most so many. */
const PERMUTED_LINES_MAX = 4;
/** Gates of one piece at most, of each list. */
const PIECE_GATES_MAX = 400;
const GATES_MAX = 40_000;
/** Sets of lines tried from one gate at the front. */
const SETS_MAX = 48;
/** Gates at the front that are tried before this road is given up. */
const FRONTS_MAX = 24;
/** Largest angle between two pieces that count as the same. */
const SAME_ANGLE = 1e-7;
const SAME_AMPLITUDE = 1e-7;

export type Pieces = { hilbertSchmidt: number; pieces: number; longest: number };

export function comparePieces({ left, right, asWritten }: Sides): Pieces | null {
  const isSimplified = left.length < asWritten.left.length || right.length < asWritten.right.length; // biome-ignore format: one condition
  return piecesOf(left, right) ?? (isSimplified ? piecesOf(asWritten.left, asWritten.right) : null);
}

function piecesOf(left: readonly LineGate[], right: readonly LineGate[]): Pieces | null {
  if (left.length + right.length > GATES_MAX) return null;
  const [a, b] = [new Front(left), new Front(right)];
  let angle = 0;
  let pieces = 0;
  let longest = 0;
  while (a.count > 0 || b.count > 0) {
    if (a.takeSwaps() || b.takeSwaps()) continue;
    const found = nextPiece(a, b);
    if (!found) return null;
    angle += found.angle;
    pieces++;
    longest = Math.max(longest, found.left.length, found.right.length);
    a.take(found.left);
    b.take(found.right);
    b.rename(found.set, found.order);
  }
  if (!sameNames(a, b)) return null;
  return { hilbertSchmidt: 2 * Math.sin(Math.min(Math.PI / 2, angle) / 2) ** 2, pieces, longest };
}

/** Every line must end under its own name, or under one and the same other name in both. */
function sameNames(a: Front, b: Front): boolean {
  return [...a.lines, ...b.lines].every((line) => a.nameOf(line) === b.nameOf(line));
}

/** A list of gates of which some at the front were taken. */
class Front {
  readonly gates: readonly LineGate[];
  count: number;
  private readonly onLine = new Map<number, number[]>();
  /** Per line, how many of its gates are gone: gates go in order. */
  private readonly gone = new Map<number, number>();
  private readonly isTaken: Uint8Array;
  private first = 0;
  /** Names of lines, and lines by name, where they are not their own. */
  private readonly names = new Map<number, number>();
  private readonly named = new Map<number, number>();

  constructor(gates: readonly LineGate[]) {
    this.gates = gates;
    this.count = gates.length;
    this.isTaken = new Uint8Array(gates.length);
    gates.forEach(({ lines }, k) => {
      for (const line of lines) {
        const list = this.onLine.get(line);
        if (list) list.push(k);
        else this.onLine.set(line, [k]);
      }
    });
  }

  take(list: readonly number[]): void {
    for (const index of list) {
      this.isTaken[index] = 1;
      this.count--;
      for (const line of this.gates[index]!.lines)
        this.gone.set(line, (this.gone.get(line) ?? 0) + 1);
    }
    while (this.first < this.gates.length && this.isTaken[this.first]) this.first++;
  }

  get lines(): number[] {
    return [...this.onLine.keys()];
  }

  nameOf(line: number): number {
    return this.names.get(line) ?? line;
  }

  lineOf(name: number): number {
    return this.named.get(name) ?? name;
  }

  namesOf(index: number): number[] {
    return this.gates[index]!.lines.map((line) => this.nameOf(line));
  }

  /** What goes by `set[order[k]]` from now on went by `set[k]`. */
  rename(set: readonly number[], order: readonly number[]): void {
    const lines = set.map((name) => this.lineOf(name));
    lines.forEach((line, k) => {
      const name = set[order[k]!]!;
      this.names.set(line, name);
      this.named.set(name, line);
    });
  }

  /** Takes swaps at the front as a change of names; false when there is none. */
  takeSwaps(): boolean {
    const index = this.ready().find((k) => isSwap(this.gates[k]!));
    if (index === undefined) return false;
    const names = this.namesOf(index);
    this.take([index]);
    this.rename(names, [1, 0]);
    return true;
  }

  /** The first gate left on a line, or -1. */
  on(line: number): number {
    return this.onLine.get(line)?.[this.gone.get(line) ?? 0] ?? -1;
  }

  /** Gates that wait for nothing, in order, a few of them. */
  ready(): number[] {
    const found: number[] = [];
    for (let k = this.first; k < this.gates.length && found.length < FRONTS_MAX; k++) {
      if (!this.isTaken[k] && this.gates[k]!.lines.every((line) => this.on(line) === k))
        found.push(k);
      if (k > this.first + 64 * FRONTS_MAX) break;
    }
    return found;
  }

  /** The beginning within a set of lines, given by their names, and the gates that end it on each line. */
  beginning(byName: readonly number[]): { inside: number[]; blockers: number[] } {
    const set = new Set(byName.map((name) => this.lineOf(name)));
    const at = new Map([...set].map((line) => [line, this.gone.get(line) ?? 0]));
    const inside: number[] = [];
    const blockers = new Set<number>();
    const isBlocked = new Set<number>();
    while (inside.length < PIECE_GATES_MAX && isBlocked.size < set.size) {
      // the earliest gate that some line of the set waits for
      let next = -1;
      for (const line of set) {
        if (isBlocked.has(line)) continue;
        const index = this.onLine.get(line)?.[at.get(line)!] ?? -1;
        if (index < 0) isBlocked.add(line);
        else if (next < 0 || index < next) next = index;
      }
      if (next < 0) break;
      const { lines } = this.gates[next]!;
      const isFree = lines.every((line) => set.has(line) && !isBlocked.has(line));
      if (isFree) {
        inside.push(next);
        for (const line of lines) at.set(line, at.get(line)! + 1);
        continue;
      }
      blockers.add(next);
      for (const line of lines) if (set.has(line)) isBlocked.add(line);
    }
    return { inside, blockers: [...blockers] };
  }
}

/** `order[k]`: the place in the set where the first list has what the second one has on its line k. */
type Piece = {
  left: number[];
  right: number[];
  angle: number;
  set: readonly number[];
  order: number[];
};

function nextPiece(a: Front, b: Front): Piece | null {
  // a list that has ended leaves gates that must make nothing
  const [from, isLeft] = a.count > 0 ? [a, true] : [b, false];
  for (const start of from.ready()) {
    const found = pieceAround(a, b, from.namesOf(start), isLeft);
    if (found) return found;
  }
  return null;
}

/** Sets that hold these lines, smallest first. */
function pieceAround(a: Front, b: Front, lines: readonly number[], isLeft: boolean): Piece | null {
  const seen = new Set<string>();
  let waiting: number[][] = [[...lines]];
  for (let tried = 0; waiting.length > 0 && tried < SETS_MAX; tried++) {
    waiting.sort((x, y) => x.length - y.length);
    const [set, ...others] = waiting as [number[], ...number[][]];
    waiting = others;
    const [p, q] = [a.beginning(set), b.beginning(set)];
    const found = equalBeginnings(a, b, p.inside, q.inside, set, isLeft);
    if (found) return found;
    for (const [front, blockers] of [
      [a, p.blockers],
      [b, q.blockers],
    ] as const) {
      for (const index of blockers) {
        const more = [...new Set([...set, ...front.namesOf(index)])].sort((x, y) => x - y);
        const key = more.join();
        if (more.length > LINES_MAX || seen.has(key)) continue;
        seen.add(key);
        waiting.push(more);
      }
    }
  }
  return null;
}

/** The shortest beginnings of both lists that do the same and take at least one gate. */
function equalBeginnings(
  a: Front,
  b: Front,
  left: readonly number[],
  right: readonly number[],
  set: readonly number[],
  isLeft: boolean,
): Piece | null {
  if ((isLeft ? left : right).length === 0) return null;
  const [p, q] = [statesAlong(a, left, set), statesAlong(b, right, set)];
  for (let sum = 1; sum <= left.length + right.length; sum++) {
    for (let i = Math.max(0, sum - right.length); i <= Math.min(sum, left.length); i++) {
      const j = sum - i;
      if ((isLeft ? i : j) === 0) continue;
      const order = orderOf(p[i]!, q[j]!, set.length);
      if (!order) continue;
      const piece = { left: left.slice(0, i), right: right.slice(0, j), set, order };
      const angle = angleOf(a, b, piece);
      if (angle <= SAME_ANGLE) return { ...piece, angle };
    }
  }
  return null;
}

function applied(
  { lines, matrix }: LineGate,
  data: Float64Array,
  place: ReadonlyMap<number, number>,
  columns: number,
): void {
  applyMatrixInto(data, matrix, lines.map((line) => place.get(line)!), place.size, columns); // biome-ignore format: one call
}

function placesOf(front: Front, set: readonly number[]): Map<number, number> {
  return new Map(set.map((name, k) => [front.lineOf(name), k]));
}

/** The state after 0, 1, 2, ... gates, from one random state for each number of lines. */
function statesAlong(
  front: Front,
  list: readonly number[],
  set: readonly number[],
): Float64Array[] {
  const place = placesOf(front, set);
  const states = [startOf(set.length)];
  for (const index of list) {
    const next = states.at(-1)!.slice();
    applied(front.gates[index]!, next, place, 1);
    states.push(next);
  }
  return states;
}

const starts = new Map<number, Float64Array>();

function startOf(lines: number): Float64Array {
  let start = starts.get(lines);
  if (!start) {
    const draw = random('piece by piece', lines);
    start = Float64Array.from({ length: 2 ** (lines + 1) }, () => normal(draw));
    starts.set(lines, start);
  }
  return start;
}

/**
 * The order of lines in which the second state is the first one up to a phase, or null: order[k] is the place that line k of the
 * second state has in the first one.
 */
function orderOf(a: Float64Array, b: Float64Array, n: number): number[] | null {
  const half = a.length / 2;
  // the first and the last entry stay where they are in any order
  for (const k of [0, half - 1]) {
    const [x, y, u, v] = [a[k]!, a[half + k]!, b[k]!, b[half + k]!];
    if (Math.abs(x * x + y * y - u * u - v * v) > SAME_AMPLITUDE * (1 + x * x + y * y)) return null;
  }
  const own = Array.from({ length: n }, (_, k) => k);
  if (isSameState(a, b)) return own;
  if (n > PERMUTED_LINES_MAX) return null;
  return permutations(n).find((order) => isSameState(a, reordered(b, order, 1))) ?? null;
}

const known = new Map<number, number[][]>();

function permutations(n: number): number[][] {
  const found = known.get(n);
  if (found) return found;
  const made: number[][] =
    n === 0
      ? [[]]
      : permutations(n - 1).flatMap((rest) =>
          Array.from({ length: n }, (_, k) => [...rest.slice(0, k), n - 1, ...rest.slice(k)]),
        );
  known.set(n, made);
  return made;
}

/** Rows with line k moved to place order[k]. */
function reordered(data: Float64Array, order: readonly number[], columns: number): Float64Array {
  const n = order.length;
  const rows = data.length / 2 / columns;
  const out = new Float64Array(data.length);
  for (let row = 0; row < rows; row++) {
    let to = 0;
    order.forEach((place, k) => {
      if ((row >> (n - 1 - k)) & 1) to += 1 << (n - 1 - place);
    });
    for (const part of [0, rows]) {
      out.set(
        data.subarray((part + row) * columns, (part + row + 1) * columns),
        (part + to) * columns,
      );
    }
  }
  return out;
}

/** Up to a phase. */
function isSameState(a: Float64Array, b: Float64Array): boolean {
  const [re, im] = innerProduct(a, b);
  return Math.hypot(re, im) >= Math.sqrt(normSquared(a) * normSquared(b)) * (1 - SAME_AMPLITUDE);
}

function angleOf(a: Front, b: Front, { left, right, set, order }: Omit<Piece, 'angle'>): number {
  const d = 2 ** set.length;
  const matrixOf = (front: Front, list: readonly number[]): Float64Array => {
    const out = identity(d);
    const place = placesOf(front, set);
    for (const index of list) applied(front.gates[index]!, out, place, d);
    return out;
  };
  const moved = reordered(matrixOf(b, right), order, d);
  return distanceAngle(hilbertSchmidtDistance(matrixOf(a, left), moved).distance);
}

function isSwap({ lines, matrix }: LineGate): boolean {
  return lines.length === 2 && matrix.every((x, k) => x === (k === 0 || k === 6 || k === 9 || k === 15 ? 1 : 0)); // biome-ignore format: one condition
}
