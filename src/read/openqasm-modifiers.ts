/**
 * Gate modifiers on lists of gates: `ctrl @`, `negctrl @`, `inv @` and `pow(k) @`.
 *
 * Convention: phases count, as OpenQASM 3 says: a factor e^{i phase} inside a gate becomes a phase on the
 * control. Integer powers repeat; other powers are principal powers of the exact matrix (eigenphases in
 * (-pi, pi]). Controls and powers commute, because the power of a controlled gate is the controlled power.
 */
import {
  type BarrierOperation,
  type GateOperation,
  gate,
  unitaryGate,
} from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import { type Reader, spend } from './openqasm-names.ts';
import { fail } from './openqasm-problems.ts';

/** Gates (and barriers between them) on wires of the circuit, times e^{i phase}. */
export type Piece = { operations: (GateOperation | BarrierOperation)[]; phase: number };

/** Largest gate whose fractional power is taken by its matrix. */
const POWER_WIRES_MAX = 6;
const POWER_MAX = 1e6;

/** Adds one control in front of everything; `positive` = on |1>. */
export function controlPiece(
  r: Reader,
  at: number,
  piece: Piece,
  wire: number,
  positive: boolean,
): Piece {
  spend(
    r,
    at,
    piece.operations.reduce((sum, { wires }) => sum + 1 + wires.length, 0),
  );
  const operations = piece.operations.map((operation) =>
    operation.kind === 'barrier'
      ? operation
      : {
          ...operation,
          wires: [wire, ...operation.wires],
          controls: [positive, ...operation.controls],
        },
  );
  if (piece.phase === 0) return { operations, phase: 0 };
  // |0><0| x 1 + |1><1| x e^{ig} = p(g); the other way round it is e^{ig} p(-g)
  if (positive) return { operations: [...operations, gate('p', [wire], piece.phase)], phase: 0 };
  return { operations: [...operations, gate('p', [wire], -piece.phase)], phase: piece.phase };
}

export function invertPiece(r: Reader, at: number, piece: Piece): Piece {
  spend(r, at, piece.operations.length);
  const operations = piece.operations.map(invertGate).reverse();
  return { operations, phase: -piece.phase };
}

function invertGate<T extends GateOperation | BarrierOperation>(operation: T): T | GateOperation {
  if (operation.kind === 'barrier') return operation;
  const entry = gateTable.get(operation.name);
  if (operation.power !== 1 || !entry) return { ...operation, power: -operation.power };
  const { name, angles } = entry.inverse(operation.angles);
  return { ...operation, name, angles: angles.map((x) => (x === 0 ? 0 : x)) };
}

/**
 * `pow(exponent) @` the piece, which is a gate named `label` on `wires`.
 */
export function powerPiece(
  r: Reader,
  at: number,
  piece: Piece,
  exponent: number,
  wires: readonly number[],
  label: string,
): Piece {
  if (Math.abs(exponent) > POWER_MAX) {
    const message = `powers must be in [-${POWER_MAX}, ${POWER_MAX}], got ${exponent}`;
    fail(r.problems, at, 'too-large', message);
  }
  if (exponent === 1) return piece;
  const isWhole = Number.isInteger(exponent);
  const { operations, phase } = piece;
  const [only] = operations;
  const single = operations.length === 1 && only?.kind === 'gate' ? only : undefined;
  if (operations.length === 0) {
    return { operations: [], phase: exponent * (isWhole ? phase : principal(phase)) };
  }
  if (isWhole) {
    if (exponent === 0) return { operations: [], phase: 0 };
    const base = exponent < 0 ? invertPiece(r, at, piece) : piece;
    const times = Math.abs(exponent);
    if (times === 1) return base;
    if (single) {
      const powered = { ...single, power: single.power * exponent };
      return { operations: [powered], phase: phase * exponent };
    }
    spend(r, at, times * operations.length);
    const repeated: Piece['operations'] = [];
    for (let k = 0; k < times; k++)
      for (const operation of base.operations) repeated.push(operation);
    return { operations: repeated, phase: phase * exponent };
  }
  if (single && phase === 0 && single.power === 1) {
    return { operations: [{ ...single, power: exponent }], phase: 0 };
  }
  const whole = wholeGate(r, at, piece, wires, label);
  return { operations: [{ ...whole, power: exponent }], phase: 0 };
}

/** An angle in (-pi, pi]. */
function principal(angle: number): number {
  const turned = angle - 2 * Math.PI * Math.round(angle / (2 * Math.PI));
  return turned <= -Math.PI ? turned + 2 * Math.PI : turned;
}

/** The piece as one gate with a matrix, which remembers how it is made. */
export function wholeGate(
  r: Reader,
  at: number,
  piece: Piece,
  wires: readonly number[],
  label: string,
): GateOperation {
  if (wires.length > POWER_WIRES_MAX) {
    const message = `fractional powers of a gate on ${wires.length} wires: ${POWER_WIRES_MAX} is the limit here`;
    fail(r.problems, at, 'too-large', message);
  }
  const place = new Map(wires.map((wire, k) => [wire, k]));
  const operations: GateOperation[] = [];
  for (const operation of piece.operations) {
    if (operation.kind !== 'gate') continue;
    const local = operation.wires.map((wire) => place.get(wire)!); // the piece acts on these wires only
    operations.push({ ...operation, wires: local });
  }
  const definition = { operations, phase: piece.phase };
  spend(r, at, 2 * 4 ** wires.length);
  return { ...unitaryGate(pieceMatrix(definition, wires.length), wires, label), definition };
}

/** The matrix of gates on wires 0 .. n-1 times e^{i phase}. */
export function pieceMatrix(
  {
    operations,
    phase,
  }: { operations: readonly (GateOperation | BarrierOperation)[]; phase: number },
  n: number,
): Float64Array {
  const d = 2 ** n;
  const matrix = new Float64Array(2 * d * d);
  for (let i = 0; i < d; i++) {
    matrix[i * d + i] = Math.cos(phase);
    matrix[d * d + i * d + i] = Math.sin(phase);
  }
  for (const operation of operations) {
    if (operation.kind === 'gate') applyGateInto(matrix, operation, n, d);
  }
  return matrix;
}

/** Gates of the standard that are another one under `ctrl @`. */
const CONTROLLED = new Map([
  ['x', 'cx'],
  ['y', 'cy'],
  ['z', 'cz'],
  ['h', 'ch'],
  ['p', 'cp'],
  ['rx', 'crx'],
  ['ry', 'cry'],
  ['rz', 'crz'],
  ['swap', 'cswap'],
  ['cx', 'ccx'],
  ['CX', 'ccx'],
]);

/** `ctrl @ x` is `cx`: the innermost controls go into the name where the standard has one. */
export function foldControls(operation: GateOperation): GateOperation {
  let { name, controls } = operation;
  while (operation.power === 1 && controls.length > 0 && controls[controls.length - 1]) {
    const next = CONTROLLED.get(name);
    if (!next) break;
    name = next;
    controls = controls.slice(0, -1);
  }
  return name === operation.name ? operation : { ...operation, name, controls };
}
