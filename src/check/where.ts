/**
 * Says where two circuits part: the stretches of both texts before which a beginning of the one is a beginning of the other,
 * behind which an end of the one is an end of the other, and within which neither is so.
 *
 * Method: what both begin with, up to commutation, is taken out (`cancel` of `gate-by-gate.ts`). What is left of each is applied
 * gate by gate to one random state; two beginnings agree when their states do, up to a phase, which is told by their overlaps
 * with two fixed sparse random vectors. The last two beginnings that agree are found by searching the sorted overlaps.
 * Then the same from the ends. Result: the lines of the gates that are left; null for a circuit that has none there; no
 * answer where the circuits are no gates on lines. A gate in a stretch may be right; the stretches as a whole differ.
 */
import type { Circuit } from '../circuit/circuit.ts';
import { applyMatrixInto } from '../circuit/unitary.ts';
import type { Contract } from '../contract.ts';
import { adjoint, normSquared } from '../numeric/complex-matrix.ts';
import { normal, type Random, random } from '../numeric/random.ts';
import type { Stretch } from '../reports.ts';
import { isAnnotated } from './annotations.ts';
import { cancel } from './gate-by-gate.ts';
import { type LineGate, linesOf } from './lines.ts';
import { endsOf, visible } from './sides.ts';

/** Gates that differ by no more count as the same one here. */
const EQUAL_ANGLE = 1e-11;
/** (Gates) x (amplitudes) that are followed at most; beyond, what is left over is taken as it is. */
const WORK_MAX = 2 ** 30;
/** With more lines than this only those that the gates are on are followed. */
const LINES_MAX = 12;
const GATES_MAX = 20_000;
const OVERLAPS = 2;
/** Entries of a probe that are not zero; with fewer a gate with many controls could miss them all. */
const PROBE_ROWS = 512;
type Probe = { at: Int32Array; weights: Float64Array };
const SAME_OVERLAP = 1e-9;

export type Parting = { original: Stretch; rewritten: Stretch };

export function whereTheyPart(
  original: Circuit,
  rewritten: Circuit,
  contract: Contract,
): Parting | null {
  const n = contract.inputs.length;
  const a = linesOf(original, n, isAnnotated(original));
  const b = linesOf(rewritten, n, isAnnotated(rewritten));
  if (!a || !b || a.gates.length + b.gates.length > GATES_MAX) return null;
  const ends = endsOf(a, contract);
  const count = Math.max(a.count, b.count);
  const isZero = (line: number): boolean => contract.inputs[line] !== 'any';
  const [left, right] = withoutBeginning(visible(a.gates, contract, ends), visible(b.gates, contract, ends), count, isZero); // biome-ignore format: one call
  // the same from the ends, on what is left; there every state can occur
  const turned = withoutBeginning(reversed(left), reversed(right), count, () => false);
  return { original: stretch(turned[0]), rewritten: stretch(turned[1]) };
}

function reversed(gates: readonly LineGate[]): LineGate[] {
  return gates.map((gate) => ({ ...gate, matrix: adjoint(gate.matrix, 2 ** gate.lines.length) })).reverse(); // biome-ignore format: one list
}

function stretch(gates: readonly LineGate[]): Stretch {
  const lines = gates.flatMap(({ at }) => (at === undefined ? [] : [at]));
  return lines.length === 0 ? null : { from: Math.min(...lines), to: Math.max(...lines) };
}

/** Both lists without what they both begin with. */
function withoutBeginning(
  left: readonly LineGate[],
  right: readonly LineGate[],
  count: number,
  isZero: (line: number) => boolean,
): [LineGate[], LineGate[]] {
  const { restLeft, restRight } = cancel(left, right, EQUAL_ANGLE);
  const waiting = new Set(restLeft);
  const common = left.filter((gate) => !waiting.has(gate));
  const [i, j] = lastAgreement(restLeft, restRight, common, count, isZero);
  return [restLeft.slice(i), restRight.slice(j)];
}

/** Numbers of gates of both lists, the last that make the same state. */
function lastAgreement(
  left: readonly LineGate[],
  right: readonly LineGate[],
  common: readonly LineGate[],
  count: number,
  isZeroInput: (line: number) => boolean,
): [number, number] {
  const isSmall = count <= LINES_MAX;
  const used = new Set([...left, ...right].flatMap(({ lines }) => lines));
  const all = Array.from({ length: count }, (_, line) => line).filter((line) => isSmall || used.has(line)); // biome-ignore format: one list
  const work = (left.length + right.length) * 2 ** all.length;
  if (all.length === 0 || work > WORK_MAX) return [0, 0];
  // with all lines at hand inputs that start in |0> do so here; otherwise the state in the middle is any
  const isZero = (line: number): boolean => isSmall && isZeroInput(line);
  const draw = random(1, 'where');
  const start = randomState(all.map(isZero), draw);
  const probes = Array.from({ length: OVERLAPS }, () => probe(2 ** all.length, draw));
  const place = new Map(all.map((line, k) => [line, k]));
  if (isSmall) for (const gate of common) apply(gate, start, place);
  const [p, q] = [left, right].map((gates) => overlapsAlong(gates, start.slice(), place, probes)) as [Float64Array[], Float64Array[]]; // biome-ignore format: a pair
  const sorted = q.map((_, j) => j).sort((x, y) => q[x]![0]! - q[y]![0]! || y - x);
  for (let i = p.length - 1; i >= 0; i--) {
    const j = partnerOf(p[i]!, q, sorted);
    if (j >= 0) return [i, j];
  }
  return [0, 0];
}

/** The last of the other beginnings with the same overlaps, or -1. */
function partnerOf(
  own: Float64Array,
  others: readonly Float64Array[],
  sorted: readonly number[],
): number {
  let [low, high] = [0, sorted.length];
  while (low < high) {
    const middle = (low + high) >> 1;
    if (others[sorted[middle]!]![0]! < own[0]! - SAME_OVERLAP) low = middle + 1;
    else high = middle;
  }
  let best = -1;
  for (let k = low; k < sorted.length; k++) {
    const other = others[sorted[k]!]!;
    if (other[0]! > own[0]! + SAME_OVERLAP) break;
    if (other.every((x, at) => Math.abs(x - own[at]!) <= SAME_OVERLAP)) best = Math.max(best, sorted[k]!); // biome-ignore format: one step
  }
  return best;
}

/** Sizes of the overlaps after 0, 1, 2, ... gates. */
function overlapsAlong(
  gates: readonly LineGate[],
  state: Float64Array,
  place: ReadonlyMap<number, number>,
  probes: readonly Probe[],
): Float64Array[] {
  const list = [overlaps(state, probes)];
  for (const gate of gates) {
    apply(gate, state, place);
    list.push(overlaps(state, probes));
  }
  return list;
}

function apply(
  { lines, matrix }: LineGate,
  state: Float64Array,
  place: ReadonlyMap<number, number>,
): void {
  applyMatrixInto(state, matrix, lines.map((line) => place.get(line)!), place.size, 1); // biome-ignore format: one call
}

function overlaps(state: Float64Array, probes: readonly Probe[]): Float64Array {
  const half = state.length / 2;
  return Float64Array.from(probes, ({ at, weights }) => {
    let [re, im] = [0, 0];
    at.forEach((row, k) => {
      const [x, y] = [weights[2 * k]!, weights[2 * k + 1]!];
      re += x * state[row]! + y * state[half + row]!;
      im += x * state[half + row]! - y * state[row]!;
    });
    return Math.hypot(re, im);
  });
}

/** A sparse random vector, scaled so that its overlaps are of the size of 1. */
function probe(d: number, draw: Random): Probe {
  const count = Math.min(d, PROBE_ROWS);
  const at = Int32Array.from({ length: count }, (_, k) => (d <= PROBE_ROWS ? k : Math.min(d - 1, Math.floor(draw() * d)))); // biome-ignore format: one list
  const scale = Math.sqrt(d / count);
  return { at, weights: Float64Array.from({ length: 2 * count }, () => scale * normal(draw)) };
}

/** A random vector of unit length in which the lines marked are |0>; planar. */
function randomState(isZero: readonly boolean[], draw: Random): Float64Array {
  const n = isZero.length;
  const d = 2 ** n;
  const state = new Float64Array(2 * d);
  for (let k = 0; k < d; k++) {
    if (isZero.some((zero, line) => zero && (k >> (n - 1 - line)) & 1)) continue;
    state[k] = normal(draw);
    state[d + k] = normal(draw);
  }
  const length = Math.sqrt(normSquared(state));
  return state.map((x) => x / length);
}
