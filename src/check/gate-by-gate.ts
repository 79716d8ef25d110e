/**
 * Proves two circuits of any size equal by cancelling their gates one against the other.
 *
 * Method: of what an observer could notice (`sides.ts`) each gate of the original is looked for in the other list; it may be
 * taken from there when it commutes with all that stand before it on its lines. What is left of both is compared densely
 * when it is on few lines.
 * Proves: the same, with D at most 1 - cos(sum of angles of the pairs that were cancelled); it never proves a difference.
 * Cost: about (gates) x (gates that wait on a line); thousands of gates take well under a second.
 */
import { applyMatrixInto } from '../circuit/unitary.ts';
import { identity, mul } from '../numeric/complex-matrix.ts';
import { distanceAngle, hilbertSchmidtDistance } from '../numeric/distance.ts';
import type { LineGate } from './lines.ts';
import type { Sides } from './sides.ts';

/** Largest angle at which two gates count as the same one. */
const SAME_ANGLE = 1e-6;
const REST_LINES_MAX = 8;
/** With more than this left over, nothing further is looked for. */
const REST_GATES_MAX = 64;
const COMMUTE_LINES_MAX = 5;

export type GateByGate = {
  /** Bound on D, from the sum of the angles of all pairs. */
  hilbertSchmidt: number;
  cancelled: number;
  /** Gates of both lists that were compared as a whole. */
  rest: number;
};

/** The proof, or null when this road does not lead there. */
export function compareGateByGate({ left, right }: Sides): GateByGate | null {
  const { angle, pairs, restLeft, restRight } = cancel(left, right);
  const rest = restAngle(restLeft, restRight);
  if (rest === null) return null;
  const total = Math.min(Math.PI / 2, angle + rest);
  return {
    hilbertSchmidt: 2 * Math.sin(total / 2) ** 2,
    cancelled: pairs,
    rest: restLeft.length + restRight.length,
  };
}

export type Cancelled = {
  /** Sum of the angles between the gates that were taken for the same. */
  angle: number;
  pairs: number;
  restLeft: LineGate[];
  restRight: LineGate[];
};

/** Takes out of both what they both begin with, up to commutation: each list does what was taken out, then its rest. */
export function cancel(
  left: readonly LineGate[],
  right: readonly LineGate[],
  sameAngle = SAME_ANGLE,
  restMax = REST_GATES_MAX,
): Cancelled {
  const isTaken = new Uint8Array(right.length);
  const onLine = new Map<number, number[]>();
  right.forEach(({ lines }, k) => {
    for (const line of lines) {
      const list = onLine.get(line);
      if (list) list.push(k);
      else onLine.set(line, [k]);
    }
  });
  let angle = 0;
  let pairs = 0;
  const restLeft: LineGate[] = [];
  for (const gate of left) {
    // what waits of the original must be passed as well
    const isFree = restLeft.length <= restMax && restLeft.every((other) => commute(other, gate));
    const found = isFree ? partnersOf(gate, right, onLine, sameAngle) : null;
    if (!found) {
      restLeft.push(gate);
      continue;
    }
    for (const index of found.taken) {
      isTaken[index] = 1;
      for (const line of gate.lines) {
        const list = onLine.get(line)!; // the gate itself stands there
        list.splice(list.indexOf(index), 1);
      }
    }
    angle += found.angle;
    pairs++;
  }
  const restRight = right.filter((_, k) => !isTaken[k]);
  return { angle, pairs, restLeft, restRight };
}

/** Gates on the same lines whose product may stand for one: a condition and its opposite, for example. */
const PRODUCT_MAX = 4;

/**
 * The gates of the other list that make up this one: the first on the same lines that can come before everything that
 * stands before them, one alone or the product of a few.
 */
function partnersOf(
  gate: LineGate,
  right: readonly LineGate[],
  onLine: ReadonlyMap<number, number[]>,
  sameAngle: number,
): { taken: number[]; angle: number } | null {
  const taken: number[] = [];
  let product: Float64Array | null = null;
  const d = 2 ** gate.lines.length;
  for (const index of onLine.get(gate.lines[0]!) ?? []) {
    const other = right[index]!;
    if (!isOnSameLines(gate, other)) continue;
    const canMove = gate.lines.every((line) =>
      (onLine.get(line) ?? []).every(
        (before) => before >= index || taken.includes(before) || commute(other, right[before]!),
      ),
    );
    if (!canMove) continue;
    const alone = angleBetween(gate.matrix, other.matrix, sameAngle);
    const isFirst = taken.every((before) => commute(other, right[before]!));
    if (alone !== null && isFirst) return { taken: [index], angle: alone };
    if (taken.length >= PRODUCT_MAX) continue;
    product = product ? mul(other.matrix, product, d) : other.matrix;
    taken.push(index);
    const angle = angleBetween(gate.matrix, product, sameAngle);
    if (angle !== null) return { taken, angle };
  }
  return null;
}

function isOnSameLines(a: LineGate, b: LineGate): boolean {
  return a.lines.length === b.lines.length && a.lines.every((line, k) => line === b.lines[k]);
}

/** The angle between two unitaries when it is tiny; null for different ones. */
function angleBetween(a: Float64Array, b: Float64Array, sameAngle: number): number | null {
  const angle = distanceAngle(hilbertSchmidtDistance(a, b).distance);
  return angle <= sameAngle ? angle : null;
}

/** Whether two gates commute for certain: apart, both controls on every common line, or by their matrices. */
function commute(a: LineGate, b: LineGate): boolean {
  const common = a.lines.filter((line) => b.lines.includes(line));
  if (common.length === 0) return true;
  const areControls = common.every(
    (line) => a.isControl[a.lines.indexOf(line)] && b.isControl[b.lines.indexOf(line)],
  );
  if (areControls) return true;
  const all = [...new Set([...a.lines, ...b.lines])].sort((x, y) => x - y);
  if (all.length > COMMUTE_LINES_MAX) return false;
  const d = 2 ** all.length;
  const [p, q] = [wideMatrix(a, all), wideMatrix(b, all)];
  const [pq, qp] = [mul(p, q, d), mul(q, p, d)];
  return pq.every((x, k) => Math.abs(x - qp[k]!) < 1e-14);
}

function wideMatrix({ lines, matrix }: LineGate, all: readonly number[]): Float64Array {
  const d = 2 ** all.length;
  const places = lines.map((line) => all.indexOf(line));
  return applyMatrixInto(identity(d), matrix, places, all.length, d);
}

/** The angle between what is left of both, by its matrix; null when that is on too many lines or not small. */
function restAngle(left: readonly LineGate[], right: readonly LineGate[]): number | null {
  const all = [...new Set([...left, ...right].flatMap(({ lines }) => lines))].sort((x, y) => x - y);
  if (all.length === 0) return 0;
  if (all.length > REST_LINES_MAX) return null;
  const d = 2 ** all.length;
  const [p, q] = [left, right].map((gates) => {
    const out = identity(d);
    for (const { lines, matrix } of gates) {
      const places = lines.map((line) => all.indexOf(line));
      applyMatrixInto(out, matrix, places, all.length, d);
    }
    return out;
  }) as [Float64Array, Float64Array];
  const angle = distanceAngle(hilbertSchmidtDistance(p, q).distance);
  return angle <= SAME_ANGLE ? angle : null;
}
