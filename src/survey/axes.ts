/**
 * Finds along which axis a gate acts on each of its wires, which decides what it commutes with.
 *
 * A gate has axis n on a wire when it commutes with n . sigma there (n = z for a control or a phase, x for the
 * target of a CX). Two gates that have the same axis on every wire they share commute: both are block diagonal
 * in the joint eigenbasis of those n . sigma, with blocks that act on different wires.
 * Method: the commutators C_P = [U, P_w] for P = X, Y, Z are linear in P; the null vector of their 3 x 3 Gram
 * matrix Re Tr(C_P^dag C_Q) is the axis. More than one null vector: the gate does nothing on that wire.
 * Limits: gates on more than `AXIS_WIRES_MAX` wires have axes only on their controls.
 */
import type { GateOperation, Operation } from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';
import { baseMatrix } from '../circuit/unitary.ts';
import { hermitianEigen } from '../numeric/hermitian-eigen.ts';

/** `none`: commutes with no axis; `all`: the gate does nothing on this wire. */
export type Axis = 'none' | 'all' | readonly [number, number, number];

export const Z_AXIS: Axis = [0, 0, 1];
export const AXIS_WIRES_MAX = 5;

/** Squared commutator, relative to the size of the matrix, that counts as zero. */
const COMMUTES_BELOW = 1e-22;
/** Sine of the angle between two axes that count as the same. */
const SAME_AXIS = 1e-10;

export function sameAxis(a: Axis, b: Axis): boolean {
  if (a === 'all' || b === 'all') return true;
  if (a === 'none' || b === 'none') return false;
  const cross = [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
  return Math.hypot(...cross) < SAME_AXIS;
}

export function isZ(axis: Axis): boolean {
  return sameAxis(axis, Z_AXIS);
}

/** Keeps what was found, so that each kind of gate is looked at once. */
export type AxisFinder = (operation: Operation) => readonly Axis[];

/** A finder with a memory of its own. One axis per wire of the operation. */
export function axisFinder(): AxisFinder {
  const byName = new Map<string, readonly Axis[]>();
  const byMatrix = new WeakMap<Float64Array, Map<string, readonly Axis[]>>();
  return (operation) => {
    if (operation.kind === 'measure') return [Z_AXIS];
    if (operation.kind === 'reset') return ['none'];
    if (operation.kind !== 'gate') return [];
    let memory = byName;
    if (operation.matrix) {
      memory = byMatrix.get(operation.matrix) ?? new Map();
      byMatrix.set(operation.matrix, memory);
    }
    const { name, angles, power, controls } = operation;
    const key = `${name}|${angles.join()}|${power}|${controls.length}`;
    let axes = memory.get(key);
    if (!axes) {
      axes = axesOf(operation);
      memory.set(key, axes);
    }
    return axes;
  };
}

function axesOf(operation: GateOperation): Axis[] {
  const { name, controls, wires, power } = operation;
  const axes: Axis[] = controls.map(() => Z_AXIS);
  const count = wires.length - controls.length;
  const entry = gateTable.get(name);
  const isWhole = power === 1;
  const matrix = count <= AXIS_WIRES_MAX ? baseMatrix(operation) : null;
  for (let place = 0; place < count; place++) {
    if (isWhole && entry?.controlOperands.includes(place)) axes.push(Z_AXIS);
    else axes.push(matrix ? axisOn(matrix, count, place) : 'none');
  }
  return axes;
}

/** The axis of a planar 2^k x 2^k unitary on one of its wires. */
export function axisOn(u: Float64Array, k: number, place: number): Axis {
  const d = 2 ** k;
  const commutators = [0, 1, 2].map((pauli) => commutator(u, k, place, pauli));
  const gram = new Float64Array(18);
  for (let p = 0; p < 3; p++) {
    for (let q = 0; q < 3; q++) {
      let sum = 0;
      const [a, b] = [commutators[p]!, commutators[q]!];
      for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
      gram[3 * p + q] = sum / d;
    }
  }
  if (gram[0]! + gram[4]! + gram[8]! < COMMUTES_BELOW) return 'all';
  const exact = exactAxis(gram);
  if (exact) return exact;
  const { vectors } = hermitianEigen(gram, 3);
  // the lowest vector; a real symmetric matrix, so it is real up to one phase
  const re = [0, 1, 2].map((i) => vectors[3 * i]!);
  const im = [0, 1, 2].map((i) => vectors[9 + 3 * i]!);
  const longer = Math.hypot(...re) >= Math.hypot(...im) ? re : im;
  const size = Math.hypot(...longer);
  const axis = longer.map((x) => x / size) as [number, number, number]; // three entries by construction
  let rest = 0;
  for (let i = 0; i < 2 * d * d; i++) {
    const x = commutators.reduce((sum, part, p) => sum + axis[p]! * part[i]!, 0);
    rest += (x * x) / d;
  }
  return rest < COMMUTES_BELOW ? axis : 'none';
}

/** The axes x, y, z themselves, without rounding. */
function exactAxis(gram: Float64Array): Axis | undefined {
  const axes: readonly Axis[] = [
    [1, 0, 0],
    [0, 1, 0],
    [0, 0, 1],
  ];
  const zero = [0, 4, 8].map((at) => gram[at]! < COMMUTES_BELOW);
  if (zero.filter(Boolean).length !== 1) return undefined;
  return axes[zero.indexOf(true)];
}

/** U P - P U for P = X, Y, Z (0, 1, 2) on one wire, planar. */
function commutator(u: Float64Array, k: number, place: number, pauli: number): Float64Array {
  const d = 2 ** k;
  const s = 2 ** (k - 1 - place);
  const out = new Float64Array(2 * d * d);
  // P |column> = factor(column) |column ^ flip>
  const flip = pauli === 2 ? 0 : s;
  const factor = (state: number): [number, number] => {
    const sign = state & s ? -1 : 1;
    return pauli === 0 ? [1, 0] : pauli === 1 ? [0, sign] : [sign, 0];
  };
  for (let row = 0; row < d; row++) {
    for (let column = 0; column < d; column++) {
      const [fr, fi] = factor(column);
      const [gr, gi] = factor(row ^ flip);
      const a = row * d + (column ^ flip);
      const b = (row ^ flip) * d + column;
      const [ar, ai, br, bi] = [u[a]!, u[d * d + a]!, u[b]!, u[d * d + b]!];
      out[row * d + column] = ar * fr - ai * fi - (gr * br - gi * bi);
      out[d * d + row * d + column] = ar * fi + ai * fr - (gr * bi + gi * br);
    }
  }
  return out;
}
