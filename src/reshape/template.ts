/**
 * Describes circuits with open angles: rotations and entanglers in a fixed order.
 *
 * Convention: angles are numbered in the order of the steps, one per rotation R = exp(-i angle P / 2) and
 * one per entangler of free angle. Wire 0 is the most significant bit; the first wire of an entangler is
 * its first operand.
 * Method: after an entangler E a wire needs three rotations at most, and two where some rotation about an
 * axis passes from the right of E to a single wire on its left, E R(t) = R'(t) E: that one is then already
 * covered by the rotations before. A CX lets Rz pass its control and Rx its target, which leaves
 * 3 n + 4 c angles for c CX on n wires, the number in the dimension count of Shende, Markov, Bullock, PRA 69,
 * 062321 (2004), proposition III.1.
 * Fails: an unknown name of an entangler, or one that is not on two wires, throws InputError
 * `unknown-entangler`.
 */
import { assert } from '../assert.ts';
import { type GateOperation, gate, unitaryGate } from '../circuit/circuit.ts';
import { gateTable, PAULI } from '../circuit/gates.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import { InputError } from '../input-error.ts';
import { adjoint, identity, kron, mul } from '../numeric/complex-matrix.ts';

export type Axis = 'x' | 'y' | 'z';

export type RotationStep = { kind: 'rotation'; axis: Axis; wire: number };
/** A two-wire gate: fixed (of the gate table, or `matrix`, planar 4 x 4), or with one angle of its own. */
export type EntanglerStep = {
  kind: 'entangler';
  name: string;
  wires: readonly [number, number];
  matrix?: Float64Array;
  angle?: 'free';
};
export type Step = RotationStep | EntanglerStep;

export type Template = { wires: number; steps: readonly Step[] };

/** Which two-wire gate a template uses: a name of the gate table, or any name with a matrix of its own. */
export type Entangler = { name: string; matrix?: Float64Array; angle?: 'free' };

/** Overlaps below this count as zero when a rotation is tested for passing an entangler. */
const PASS_TOLERANCE = 1e-9;

/** Number of open angles. */
export function angleCount(template: Template): number {
  return template.steps.filter((step) => step.kind === 'rotation' || step.angle === 'free').length;
}

/**
 * The template with one entangler on each of `pairs`, in that order, and as many rotations around them as
 * can matter: it reaches everything that any circuit with these entanglers and single-wire gates reaches.
 */
export function entanglerTemplate(
  wires: number,
  pairs: readonly (readonly [number, number])[],
  entangler: Entangler = { name: 'cx' },
): Template {
  const after = rotationsAfter(entangler);
  const steps: Step[] = [];
  const turn = (wire: number, axes: readonly Axis[]): void => {
    for (const axis of axes) steps.push({ kind: 'rotation', axis, wire });
  };
  for (let wire = 0; wire < wires; wire++) turn(wire, ['z', 'x', 'z']);
  for (const [first, second] of pairs) {
    assert(
      first !== second && Math.min(first, second) >= 0 && Math.max(first, second) < wires,
      () => `an entangler on wires ${first} and ${second} of ${wires}`,
    );
    steps.push({ kind: 'entangler', wires: [first, second], ...entangler });
    turn(first, after[0]);
    turn(second, after[1]);
  }
  return { wires, steps };
}

/** The matrix of an entangler, planar 4 x 4; a free angle is set to `angle`. */
export function entanglerMatrix(entangler: Entangler, angle = 1): Float64Array {
  if (entangler.matrix) return entangler.matrix;
  const entry = gateTable.get(entangler.name);
  const angles = entangler.angle === 'free' ? 1 : 0;
  if (entry?.wires !== 2 || entry.angles !== angles) {
    throw new InputError({
      code: 'unknown-entangler',
      message: `expected a two-wire gate with ${angles} angles as entangler, got ${entangler.name}`,
    });
  }
  return entry.matrix(angles === 1 ? [angle] : []);
}

/** The rotations, in order of time, that are worth having after an entangler on its first and second wire. */
function rotationsAfter(entangler: Entangler): [readonly Axis[], readonly Axis[]] {
  const e = entanglerMatrix(entangler);
  const paulis = { x: PAULI.X, y: PAULI.Y, z: PAULI.Z };
  const passes = (side: 0 | 1, axis: Axis): boolean => {
    const p = paulis[axis];
    const wide = side === 0 ? kron(p, PAULI.I, 2, 2) : kron(PAULI.I, p, 2, 2);
    return isOnOneWire(mul(adjoint(e, 4), mul(wide, e, 4), 4));
  };
  const axesFor = (side: 0 | 1): readonly Axis[] => {
    const passing = (['z', 'x', 'y'] as const).filter((axis) => passes(side, axis));
    // all three pass: the gate is local or a swap on this wire, and nothing new can come after it
    if (passing.length === 3) return [];
    switch (passing[0]) {
      case 'z':
        return ['x', 'z'];
      case 'x':
        return ['z', 'x'];
      case 'y':
        return ['x', 'y'];
      default:
        return ['z', 'x', 'z'];
    }
  };
  return [axesFor(0), axesFor(1)];
}

/** Whether a Hermitian traceless 4 x 4 matrix acts on one of its two wires only. */
function isOnOneWire(h: Float64Array): boolean {
  const weight = (a: Float64Array, b: Float64Array): number => {
    const p = kron(a, b, 2, 2);
    let sum = 0;
    for (let k = 0; k < 32; k++) sum += p[k]! * h[k]!;
    return (sum / 4) ** 2;
  };
  const { X, Y, Z, I } = PAULI;
  const first = weight(X, I) + weight(Y, I) + weight(Z, I);
  const second = weight(I, X) + weight(I, Y) + weight(I, Z);
  return Math.max(first, second) > 1 - PASS_TOLERANCE;
}

/** The gates of a template with its angles filled in, in order. */
export function templateOperations(template: Template, angles: ArrayLike<number>): GateOperation[] {
  let next = 0;
  const operations = template.steps.map((step) => {
    if (step.kind === 'rotation') return gate(`r${step.axis}`, [step.wire], angles[next++]!);
    if (step.matrix) return unitaryGate(step.matrix, step.wires, step.name);
    return step.angle === 'free'
      ? gate(step.name, step.wires, angles[next++]!)
      : gate(step.name, step.wires);
  });
  assert(next === angles.length, () => `a template of ${next} angles was given ${angles.length}`);
  return operations;
}

/** The unitary of a template with its angles filled in: planar 2^n x 2^n. */
export function templateUnitary(template: Template, angles: ArrayLike<number>): Float64Array {
  const d = 2 ** template.wires;
  const out = identity(d);
  for (const operation of templateOperations(template, angles)) {
    applyGateInto(out, operation, template.wires, d);
  }
  return out;
}
