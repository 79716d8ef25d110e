/**
 * Takes gates on three wires or more, and gates with extra controls, apart into gates on one and two wires, exactly.
 *
 * Method: published networks where there are good ones (Toffoli in 6 CX: Nielsen, Chuang, figure 4.9; a relative-phase
 * Toffoli in 3 CX: Song, Klappenecker, quant-ph/0312225); a single-wire gate under k controls is diagonal in its own basis and
 * takes 2^(k+1) - 2 CX (`diagonal.ts`). Phases are kept, because they matter under a control. Matrices on three wires and
 * more take the quantum Shannon decomposition (`shannon.ts`).
 * Cost: `CONTROLS_MAX` controls take 510 CX; that is the limit here.
 * Fails: InputError for more controls, and for matrices on more than `MATRIX_WIRES_MAX` wires.
 */
import { type GateOperation, gate, unitaryGate } from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';
import { applyGateInto, baseMatrix, gateMatrix } from '../circuit/unitary.ts';
import { InputError } from '../input-error.ts';
import { adjoint, identity } from '../numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { unitaryEigen } from '../numeric/unitary-eigen.ts';
import { diagonalGates } from './diagonal.ts';
import { shannonGates } from './shannon.ts';

export const CONTROLS_MAX = 8;
/** Matrices on more wires are refused: they take more than 30,000 entanglers. */
export const MATRIX_WIRES_MAX = 8;

/** The same gate in gates on at most two wires without extra controls; the phase is exact. */
export function decompose(operation: GateOperation): GateOperation[] {
  const { wires, controls, name, power } = operation;
  if (controls.length === 0 && wires.length <= 2) return [operation];
  const negated = controls.flatMap((isOn, k) => (isOn ? [] : [gate('x', [wires[k]!])]));
  if (negated.length > 0) {
    const positive = { ...operation, controls: controls.map(() => true) };
    return [...negated, ...decompose(positive), ...negated];
  }
  const outer = wires.slice(0, controls.length);
  const inner = wires.slice(controls.length);
  const network = power === 1 ? networkOf(name, inner) : undefined;
  if (network) {
    if (outer.length === 0) return network.flatMap((step) => decompose(step));
    // controlling every gate of an exact network controls the whole
    return network.flatMap((step) => decompose(underControls(step, outer)));
  }
  if (inner.length === 1) return controlledOneWire(outer, inner[0]!, baseMatrix(operation));
  if (wires.length > MATRIX_WIRES_MAX) throw tooLarge(operation);
  return fromMatrix(gateMatrix(operation), wires);
}

function fromMatrix(matrix: Float64Array, wires: readonly number[]): GateOperation[] {
  return withPhase(shannonGates(matrix, wires.length), matrix, wires);
}

/** Gates on wires 0, 1, .. that make a matrix up to a phase: on `wires`, with the phase put right before them. */
function withPhase(
  operations: readonly GateOperation[],
  matrix: Float64Array,
  wires: readonly number[],
): GateOperation[] {
  const d = 2 ** wires.length;
  const made = identity(d);
  for (const step of operations) applyGateInto(made, step, wires.length, d);
  const { phase } = hilbertSchmidtDistance(made, matrix);
  const [re, im] = [Math.cos(phase), Math.sin(phase)];
  const turn = unitaryGate(Float64Array.from([re, 0, 0, re, im, 0, 0, im]), [0]);
  return [turn, ...operations].map((step) => ({
    ...step,
    wires: step.wires.map((wire) => wires[wire]!),
  }));
}

function tooLarge({ name, wires, line, column }: GateOperation): InputError {
  return new InputError({
    code: 'no-network',
    message: `number of wires of a gate without a known network must be at most ${MATRIX_WIRES_MAX}, got ${wires.length} for ${name}`,
    ...(line === undefined ? {} : { line }),
    ...(column === undefined ? {} : { column }),
  });
}

function underControls(step: GateOperation, outer: readonly number[]): GateOperation {
  return {
    ...step,
    wires: [...outer, ...step.wires],
    controls: [...outer.map(() => true), ...step.controls],
  };
}

/** Networks of table gates, exact including the phase, from smaller ones. */
function networkOf(name: string, w: readonly number[]): GateOperation[] | undefined {
  const [a, b, c, d, e] = w as [number, number, number, number, number];
  switch (name) {
    case 'cx':
    case 'CX':
      return [underControls(gate('x', [b]), [a])];
    case 'cy':
      return [underControls(gate('y', [b]), [a])];
    case 'cz':
      return [underControls(gate('z', [b]), [a])];
    case 'ch':
      return [underControls(gate('h', [b]), [a])];
    case 'swap':
      return [gate('cx', [b, a]), gate('cx', [a, b]), gate('cx', [b, a])];
    case 'ccx':
      return toffoli(a, b, c);
    case 'ccz':
      return [gate('h', [c]), ...toffoli(a, b, c), gate('h', [c])];
    case 'cswap':
      return [gate('cx', [c, b]), gate('ccx', [a, b, c]), gate('cx', [c, b])];
    case 'rccx':
      return [
        gate('h', [c]),
        gate('t', [c]),
        gate('cx', [b, c]),
        gate('tdg', [c]),
        gate('cx', [a, c]),
        gate('t', [c]),
        gate('cx', [b, c]),
        gate('tdg', [c]),
        gate('h', [c]),
      ];
    case 'c3x':
      return [underControls(gate('x', [d]), [a, b, c])];
    case 'c4x':
      return [underControls(gate('x', [e]), [a, b, c, d])];
    case 'c3sqrtx':
      return [underControls(gate('sx', [d]), [a, b, c])];
    case 'c3sqrtxdg':
      return [underControls(gate('sxdg', [d]), [a, b, c])];
    default:
      return undefined;
  }
}

function toffoli(a: number, b: number, c: number): GateOperation[] {
  return [
    gate('h', [c]),
    gate('cx', [b, c]),
    gate('tdg', [c]),
    gate('cx', [a, c]),
    gate('t', [c]),
    gate('cx', [b, c]),
    gate('tdg', [c]),
    gate('cx', [a, c]),
    gate('t', [b]),
    gate('t', [c]),
    gate('h', [c]),
    gate('cx', [a, b]),
    gate('t', [a]),
    gate('tdg', [b]),
    gate('cx', [a, b]),
  ];
}

/** u on `target` under positive controls. */
function controlledOneWire(
  controls: readonly number[],
  target: number,
  u: Float64Array,
): GateOperation[] {
  if (controls.length > CONTROLS_MAX) {
    throw new InputError({
      code: 'too-many-controls',
      message: `number of controls must be at most ${CONTROLS_MAX}, got ${controls.length}`,
    });
  }
  if (controls.length === 0) return [unitaryGate(u, [target])];
  if (controls.length === 1) return [unitaryGate(controlledMatrix(u), [controls[0]!, target])];
  if (controls.length === 2 && isMatrix(u, 'x')) return toffoli(controls[0]!, controls[1]!, target);
  if (controls.length === 2 && isMatrix(u, 'z')) {
    return [
      gate('h', [target]),
      ...toffoli(controls[0]!, controls[1]!, target),
      gate('h', [target]),
    ];
  }
  return throughDiagonal(controls, target, u);
}

/** u = v diag v^dag: under controls the diagonal becomes one on all the wires, and v stays as it is. */
function throughDiagonal(
  controls: readonly number[],
  target: number,
  u: Float64Array,
): GateOperation[] {
  const { phases, vectors } = unitaryEigen(u, 2);
  const wires = [...controls, target];
  const d = 2 ** wires.length;
  const diagonal = identity(d);
  phases.forEach((phase, k) => {
    const at = (d - 2 + k) * (d + 1);
    diagonal[at] = Math.cos(phase);
    diagonal[d * d + at] = Math.sin(phase);
  });
  const isOwn = isMatrix(u, 'x');
  const [before, after] = isOwn
    ? [gate('h', [target]), gate('h', [target])]
    : [unitaryGate(adjoint(vectors, 2), [target]), unitaryGate(vectors, [target])];
  if (isOwn) signLast(diagonal, d);
  return [before, ...withPhase(diagonalGates(diagonal, wires.length), diagonal, wires), after];
}

/** Makes the last two entries 1 and -1, the eigenvalues of X on the columns of H. */
function signLast(diagonal: Float64Array, d: number): void {
  const last = (d - 1) * (d + 1);
  diagonal[last - d - 1] = 1;
  diagonal[last] = -1;
  diagonal[d * d + last - d - 1] = 0;
  diagonal[d * d + last] = 0;
}

function controlledMatrix(u: Float64Array): Float64Array {
  const out = new Float64Array(32);
  out[0] = out[5] = 1;
  for (let i = 0; i < 2; i++) {
    for (let j = 0; j < 2; j++) {
      out[(i + 2) * 4 + j + 2] = u[i * 2 + j]!;
      out[16 + (i + 2) * 4 + j + 2] = u[4 + i * 2 + j]!;
    }
  }
  return out;
}

function isMatrix(u: Float64Array, name: string): boolean {
  return gateTable
    .get(name)!
    .matrix([])
    .every((x, k) => x === u[k]);
}
