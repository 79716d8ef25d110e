/**
 * What is left of a gate when one of its wires is known to be in |0> or |1>, or has been measured.
 *
 * The gate must have axis z on that wire: it is then |0><0| x A_0 + |1><1| x A_1, and A_value is what remains
 * on the other wires, up to a phase (which is global, because the wire's value is one number in every branch).
 * Method: A_value is a block of the gate's matrix; it is recognised as a gate of the table where it is one.
 */
import { assert } from '../assert.ts';
import { type GateOperation, gate, unitaryGate } from '../circuit/circuit.ts';
import { applyGateInto, gateMatrix } from '../circuit/unitary.ts';
import { identity } from '../numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { axisOn, isZ } from './axes.ts';

/** Largest gate whose own operands can be restricted; controls added by `ctrl @` can always. */
export const RESTRICT_WIRES_MAX = 7;

/** Below this (distance D) two gates are the same. */
const SAME_GATE = 1e-24;

/** With the operand at 1, what a controlled gate of the table becomes, in the order of the other operands. */
const UNCONTROLLED: ReadonlyMap<string, string> = new Map([
  ['cx', 'x'],
  ['CX', 'x'],
  ['cy', 'y'],
  ['cz', 'z'],
  ['ch', 'h'],
  ['csx', 'sx'],
  ['csxdg', 'sxdg'],
  ['cp', 'p'],
  ['cphase', 'p'],
  ['cu1', 'p'],
  ['crx', 'rx'],
  ['cry', 'ry'],
  ['crz', 'rz'],
  ['cu3', 'u3'],
  ['ccx', 'cx'],
  ['ccz', 'cz'],
  ['cswap', 'swap'],
  ['c3x', 'ccx'],
  ['c4x', 'c3x'],
]);
const PLAIN = ['x', 'y', 'z', 'h', 's', 'sdg', 't', 'tdg', 'sx', 'sxdg'];

/** The gate on its other wires, or null when nothing is left but a phase. */
export function restrictGate(
  operation: GateOperation,
  place: number,
  value: boolean,
): GateOperation | null {
  const { controls, wires } = operation;
  const rest = wires.filter((_, k) => k !== place);
  if (place < controls.length) {
    if (controls[place] !== value) return null;
    const fewer = controls.filter((_, k) => k !== place);
    return { ...operation, wires: rest, controls: fewer };
  }
  assert(wires.length <= RESTRICT_WIRES_MAX, () => `gate on ${wires.length} wires to restrict`);
  const block = blockOf(gateMatrix(operation), wires.length, place, value);
  if (isIdentity(block)) return null;
  const named = candidates(operation, place, rest).find((candidate) =>
    isSame(gateMatrix(candidate), block),
  );
  return named ?? { ...kept(operation), ...diagonalOr(block, rest, `${operation.name}_part`) };
}

/**
 * A gate for a matrix on the given wires. One wire: Rz where it is diagonal. Two wires with an axis on each: with a
 * body (turn the axes to z, Rz, Rz and Rzz, turn back), so that it can be written.
 */
function diagonalOr(block: Float64Array, wires: number[], label: string): GateOperation {
  const plain = unitaryGate(block, wires, label);
  if (wires.length === 1) {
    const phases = diagonalPhases(block, 2);
    return phases ? gate('rz', wires, phases[1]! - phases[0]!) : plain;
  }
  if (wires.length > 2) return plain;
  const turn: GateOperation[] = [];
  const back: GateOperation[] = [];
  for (const wire of [0, 1]) {
    const axis = axisOn(block, 2, wire);
    if (axis === 'none') return plain;
    if (axis === 'all' || isZ(axis)) continue;
    const [t, f] = [Math.acos(Math.max(-1, Math.min(1, axis[2]))), Math.atan2(axis[1], axis[0])];
    turn.push(gate('rz', [wire], -f), gate('ry', [wire], -t));
    back.push(gate('ry', [wire], t), gate('rz', [wire], f));
  }
  const turned = identity(4);
  for (const part of [...back, unitaryGate(block, [0, 1]), ...turn]) {
    applyGateInto(turned, part, 2, 4);
  }
  const phases = diagonalPhases(turned, 4);
  if (!phases) return plain;
  const [p = 0, q = 0, r = 0, s = 0] = phases;
  // phase of |st>, s and t = 1 or -1: -(a s + b t + c s t) / 2 up to a common one
  const middle = [
    gate('rz', [0], (r + s - p - q) / 2),
    gate('rz', [1], (q + s - p - r) / 2),
    gate('rzz', [0, 1], (q + r - p - s) / 2),
  ];
  const operations = [...turn, ...middle, ...back];
  return { ...plain, definition: { operations, phase: (p + q + r + s) / 4 } };
}

/** The phases of a diagonal d x d matrix; null when it is not diagonal. */
function diagonalPhases(u: Float64Array, d: number): number[] | null {
  const phases: number[] = [];
  let rest = 0;
  for (let i = 0; i < d; i++) {
    for (let j = 0; j < d; j++) {
      const [re, im] = [u[i * d + j]!, u[d * d + i * d + j]!];
      if (i === j) phases.push(Math.atan2(im, re));
      else rest += re * re + im * im;
    }
  }
  return rest < SAME_GATE ? phases : null;
}

/** Condition and position stay with what remains. */
function kept({ condition, line, column }: GateOperation): Partial<GateOperation> {
  return {
    ...(condition ? { condition } : {}),
    ...(line === undefined ? {} : { line }),
    ...(column === undefined ? {} : { column }),
  };
}

function candidates(operation: GateOperation, place: number, rest: number[]): GateOperation[] {
  const { name, angles, controls, power } = operation;
  const found: GateOperation[] = [];
  const simpler = UNCONTROLLED.get(name);
  const local = { ...kept(operation), controls, power };
  if (simpler) found.push({ ...gate(simpler, rest, ...angles), ...local });
  if (name === 'rzz') {
    found.push({ ...gate('rz', rest, angles[0]!), ...local });
    found.push({ ...gate('rz', rest, -angles[0]!), ...local });
  }
  if (controls.length > 0 && place === operation.wires.length - 1 && rest.length >= 1) {
    // ctrl @ p(t) with the target at 1 is a phase on the control
    if (controls.every(Boolean) && angles.length === 1) {
      const inner = controls.slice(1);
      found.push({ ...gate('p', rest, angles[0]! * power), ...kept(operation), controls: inner });
    }
  }
  if (rest.length === 1) {
    for (const plain of PLAIN) found.push({ ...gate(plain, rest), ...kept(operation) });
  }
  if (rest.length === 2) {
    for (const pair of [rest, [...rest].reverse()]) {
      found.push({ ...gate('cx', pair), ...kept(operation) });
      found.push({ ...gate('cz', pair), ...kept(operation) });
    }
  }
  return found;
}

/** The block of a planar 2^k x 2^k matrix where the bit of one wire has the given value, on both sides. */
function blockOf(u: Float64Array, k: number, place: number, value: boolean): Float64Array {
  const d = 2 ** k;
  const half = d / 2;
  const s = 2 ** (k - 1 - place);
  const state = (index: number): number => {
    const low = index % s;
    return (index - low) * 2 + (value ? s : 0) + low;
  };
  const out = new Float64Array(2 * half * half);
  for (let i = 0; i < half; i++) {
    for (let j = 0; j < half; j++) {
      const from = state(i) * d + state(j);
      out[i * half + j] = u[from]!;
      out[half * half + i * half + j] = u[d * d + from]!;
    }
  }
  return out;
}

function isSame(a: Float64Array, b: Float64Array): boolean {
  return a.length === b.length && hilbertSchmidtDistance(a, b).distance < SAME_GATE;
}

/** Up to a phase. */
function isIdentity(u: Float64Array): boolean {
  const d = Math.sqrt(u.length / 2);
  const one = new Float64Array(u.length);
  for (let i = 0; i < d; i++) one[i * d + i] = 1;
  return isSame(one, u);
}
