/**
 * Writes the single-wire gates of a circuit with as few gates as possible, by letting rotations pass entanglers.
 *
 * A run is what stands on one wire between two other operations there: the product of its gates, 2 x 2, planar. After it may come
 * an entangler that a rotation about one axis passes (Rz the control of a CX, Rx its target, Rz both wires of a CZ), perhaps
 * turned round; then a part of the run may be left to the next one on the wire.
 * Method: u = R(a) v; the angles a tried are those that make v simple: one component of its quaternion zero, one rotation of an
 * Euler sequence zero, or equal populations, where one SX is enough. Along each wire the choices are made together, by dynamic programming over
 * `HYPOTHESES_MAX` best lists of choices (Viterbi, IEEE Trans. Inf. Theory 13, 260 (1967)).
 * Result: for every run its gates; leaving nothing to the next run is one of the choices, and wins ties.
 */
import { mul } from '../numeric/complex-matrix.ts';
import { type Axis, rotationMatrix } from './axis-angles.ts';
import { type OneWireGate, type OneWireSet, oneWireGates, quaternion, wrapped } from './euler.ts';

export type Run = {
  matrix: Float64Array | null;
  /** What follows: everything must be written, a rotation about this axis may pass, or it is a measurement or a reset. */
  end: { kind: 'hard' | 'measure' | 'reset' } | { kind: 'pass'; axis: Axis; sign: 1 | -1 };
};

const HYPOTHESES_MAX = 3;
/** A rotation that is left to the next run by less than this is none. */
const ANGLE_MIN = 1e-12;
/** Parts of a quaternion below this have no phase. */
const COMPONENT_MIN = 1e-12;

type Hypothesis = {
  /** The rotation that came through. */
  carried: Float64Array | null;
  count: number;
  gates: readonly OneWireGate[];
  before: Hypothesis | null;
};

/** The gates of the runs of one wire, in order. */
export function writeRuns(runs: readonly Run[], set: OneWireSet): (readonly OneWireGate[])[] {
  let open: Hypothesis[] = [{ carried: null, count: 0, gates: [], before: null }];
  for (const { matrix, end } of runs) {
    const next: Hypothesis[] = [];
    for (const before of open) {
      const whole = joined(matrix, before.carried);
      for (const { gates, carried } of choices(whole, end, set)) {
        next.push({ carried, gates, count: before.count + gates.length, before });
      }
    }
    // stable: earlier choices, among them leaving nothing, win ties
    const hasNothing = next.filter(({ carried }) => carried === null);
    const hasSome = next.filter(({ carried }) => carried !== null);
    const best = (list: Hypothesis[]): Hypothesis[] => list.sort((a, b) => a.count - b.count);
    open = [...best(hasNothing).slice(0, 1), ...best(hasSome).slice(0, HYPOTHESES_MAX - 1)];
  }
  let last: Hypothesis | null = open.reduce((a, b) => (b.count < a.count ? b : a));
  const out: (readonly OneWireGate[])[] = [];
  for (; last?.before; last = last.before) out.unshift(last.gates);
  return out;
}

function joined(matrix: Float64Array | null, carried: Float64Array | null): Float64Array | null {
  if (!matrix || !carried) return matrix ?? carried;
  return mul(matrix, carried, 2);
}

type Choice = { gates: readonly OneWireGate[]; carried: Float64Array | null };

function choices(whole: Float64Array | null, end: Run['end'], set: OneWireSet): Choice[] {
  if (!whole || end.kind === 'reset') return [{ gates: [], carried: null }];
  if (end.kind === 'measure') {
    const lists = specialAngles(whole, 'z').map((angle) => oneWireGates(turned(whole, 'z', -angle), set)); // biome-ignore format: one list
    const full = oneWireGates(whole, set);
    const gates = lists.reduce((best, list) => (list.length < best.length ? list : best), full);
    return [{ gates, carried: null }];
  }
  const out: Choice[] = [{ gates: oneWireGates(whole, set), carried: null }];
  if (end.kind !== 'pass') return out;
  for (const angle of specialAngles(whole, end.axis)) {
    if (Math.abs(angle) < ANGLE_MIN) continue;
    const gates = oneWireGates(turned(whole, end.axis, -angle), set);
    out.push({ gates, carried: rotationMatrix(end.axis, end.sign * angle) });
  }
  return out;
}

/** Angles a for which R(-a) u is simple, in (-pi, pi]. */
function specialAngles(u: Float64Array, axis: Axis): number[] {
  const [q0, qx, qy, qz] = quaternion(u);
  // R(-a) turns (q0, q_axis) and the other two components by -a/2, each in its plane
  const planes = { x: [qx, qy, qz], y: [qy, qz, qx], z: [qz, qx, qy] }[axis] as [number, number, number]; // biome-ignore format: one table
  const [along, second, third] = planes;
  const [inner, outer] = [Math.hypot(q0, along), Math.hypot(second, third)];
  const [first, other] = [2 * Math.atan2(along, q0), 2 * Math.atan2(third, second)];
  const out: number[] = [];
  const quarters = (angle: number): void => {
    for (let k = 0; k < 4; k++) out.push(wrapped(angle + (k * Math.PI) / 2));
  };
  // a component of the quaternion vanishes
  if (inner > COMPONENT_MIN) quarters(first);
  if (outer > COMPONENT_MIN) quarters(other);
  if (inner > COMPONENT_MIN && outer > COMPONENT_MIN) {
    // the first or the last rotation about this axis vanishes
    quarters((first + other) / 2);
    quarters((first - other) / 2);
    // one about another axis vanishes, or as much of a state stays as goes: a balance of the two planes
    for (const sign of [1, -1]) {
      const [p, q] = [inner * inner, sign * outer * outer];
      const c = p * Math.cos(first) + q * Math.cos(other);
      const s = p * Math.sin(first) + q * Math.sin(other);
      if (Math.hypot(c, s) > COMPONENT_MIN) quarters(Math.atan2(s, c));
    }
  }
  return out;
}

/** R(angle) u. */
function turned(u: Float64Array, axis: Axis, angle: number): Float64Array {
  return mul(rotationMatrix(axis, angle), u, 2);
}
