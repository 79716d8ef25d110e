/**
 * Proves two circuits of any size equal by taking equal pieces from the front of both until nothing is left.
 *
 * Method: for a set of few lines, the gates at the front of each list that act within the set and wait for nothing outside of it
 * are a beginning of the circuit. Both beginnings are applied gate by gate to one random state; where the states agree up to a
 * phase the gates up to there are compared as matrices, and taken out of both. Sets start from a gate at the front and grow by
 * the lines of the gates that block them. So every local rewriting is undone, however many there are, at a cost that grows
 * with the number of gates and not with that of lines; windows that `narrow` reshapes are of this kind.
 * Proves: the same, with D at most 1 - cos(sum of the angles between the pieces); it never proves a difference.
 * Fails: null when no set of at most `LINES_MAX` lines has equal beginnings any more, or the lists are too long.
 */
import { applyMatrixInto } from '../circuit/unitary.ts';
import { identity } from '../numeric/complex-matrix.ts';
import { distanceAngle, hilbertSchmidtDistance } from '../numeric/distance.ts';
import { normal, random } from '../numeric/random.ts';
import type { LineGate } from './lines.ts';
import type { Sides } from './sides.ts';

const LINES_MAX = 6;
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

export function comparePieces({ left, right }: Sides): Pieces | null {
  if (left.length + right.length > GATES_MAX) return null;
  const [a, b] = [new Front(left), new Front(right)];
  let angle = 0;
  let pieces = 0;
  let longest = 0;
  while (a.count > 0 || b.count > 0) {
    const found = nextPiece(a, b);
    if (!found) return null;
    angle += found.angle;
    pieces++;
    longest = Math.max(longest, found.left.length, found.right.length);
    a.take(found.left);
    b.take(found.right);
  }
  return { hilbertSchmidt: 2 * Math.sin(Math.min(Math.PI / 2, angle) / 2) ** 2, pieces, longest };
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

  /** The beginning within a set of lines, and the gates that end it on each line. */
  beginning(set: ReadonlySet<number>): { inside: number[]; blockers: number[] } {
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

type Piece = { left: number[]; right: number[]; angle: number };

function nextPiece(a: Front, b: Front): Piece | null {
  // a list that has ended leaves gates that must make nothing
  const [from, isLeft] = a.count > 0 ? [a, true] : [b, false];
  for (const start of from.ready()) {
    const found = pieceAround(a, b, from.gates[start]!.lines, isLeft);
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
    const own = new Set(set);
    const [p, q] = [a.beginning(own), b.beginning(own)];
    const found = equalBeginnings(a, b, p.inside, q.inside, set, isLeft);
    if (found) return found;
    for (const [front, blockers] of [
      [a, p.blockers],
      [b, q.blockers],
    ] as const) {
      for (const index of blockers) {
        const more = [...new Set([...set, ...front.gates[index]!.lines])].sort((x, y) => x - y);
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
  const place = new Map(set.map((line, k) => [line, k]));
  const [p, q] = [statesAlong(a, left, place), statesAlong(b, right, place)];
  for (let sum = 1; sum <= left.length + right.length; sum++) {
    for (let i = Math.max(0, sum - right.length); i <= Math.min(sum, left.length); i++) {
      const j = sum - i;
      if ((isLeft ? i : j) === 0 || !isSameState(p[i]!, q[j]!)) continue;
      const piece = { left: left.slice(0, i), right: right.slice(0, j) };
      const angle = angleOf(a, b, piece, place);
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

/** The state after 0, 1, 2, ... gates, from one random state for each number of lines. */
function statesAlong(
  front: Front,
  list: readonly number[],
  place: ReadonlyMap<number, number>,
): Float64Array[] {
  const states = [startOf(place.size)];
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

/** Up to a phase, which the largest entry of the first state tells. */
function isSameState(a: Float64Array, b: Float64Array): boolean {
  const half = a.length / 2;
  const [x, y, u, v] = [a[0]!, a[half]!, b[0]!, b[half]!];
  // one entry alone sorts out nearly all pairs
  if (Math.abs(x * x + y * y - u * u - v * v) > SAME_AMPLITUDE * (1 + x * x + y * y)) return false;
  let [re, im, norm] = [0, 0, 0];
  for (let k = 0; k < half; k++) {
    re += a[k]! * b[k]! + a[half + k]! * b[half + k]!;
    im += a[k]! * b[half + k]! - a[half + k]! * b[k]!;
    norm += a[k]! ** 2 + a[half + k]! ** 2;
  }
  return Math.hypot(re, im) >= norm * (1 - SAME_AMPLITUDE);
}

function angleOf(
  a: Front,
  b: Front,
  { left, right }: Pick<Piece, 'left' | 'right'>,
  place: ReadonlyMap<number, number>,
): number {
  const d = 2 ** place.size;
  const matrixOf = (front: Front, list: readonly number[]): Float64Array => {
    const out = identity(d);
    for (const index of list) applied(front.gates[index]!, out, place, d);
    return out;
  };
  return distanceAngle(hilbertSchmidtDistance(matrixOf(a, left), matrixOf(b, right)).distance);
}
