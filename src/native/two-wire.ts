/**
 * Writes any two-wire gate with the fewest uses of an entangler, exactly.
 *
 * Shape: u is 4 x 4, planar; the result is gates on wires 0 and 1 in order of time, single-wire ones as `unitary`
 * operations, equal to u up to a phase.
 * Method: a core of the right class is written down, and the local gates around it follow from the canonical
 * decompositions of both: if u = A N(c) B and core = A' N(c) B', then u = (A A'^-1) core (B'^-1 B).
 *   1 CX   the CX itself;
 *   2 CX   CX (Rx(-2 c1) x Rz(-2 c2)) CX has coordinates (c1, c2, 0), because CX carries X1 to XX and 1Z to ZZ;
 *   3 CX   Vatan, Williams, PRA 69, 032315 (2004), figure 6 (its rotations turn the other way round).
 *   adjustable interaction E(t) in the class (t', 0, 0): one use per coordinate that is not zero.
 * Counts are minimal for CX: Shende, Bullock, Markov, PRA 70, 012310 (2004). CZ, ECR and every other entangler of the
 * class (pi/4, 0, 0) is a CX up to local gates and takes its place. Cores of entanglers of other classes are fitted
 * (`fitted-pair.ts`).
 * Fails: returns undefined where the entangler cannot reach the class in a few uses: it does not entangle.
 */
import { type GateOperation, gate, unitaryGate } from '../circuit/circuit.ts';
import { PAULI } from '../circuit/gates.ts';
import { applyGateInto, gateMatrix } from '../circuit/unitary.ts';
import { adjoint, identity, kron, mul } from '../numeric/complex-matrix.ts';
import { hermitianEigen } from '../numeric/hermitian-eigen.ts';
import type { Entangler } from '../reshape/template.ts';
import { entanglerMatrix } from '../reshape/template.ts';
import type { Axis } from './axis-angles.ts';
import { type Canonical, canonical, cxCount, WALL_TOLERANCE } from './canonical.ts';
import { fittedCore } from './fitted-pair.ts';

const QUARTER = Math.PI / 4;

/** How an entangler is used: as a CX with local gates around it, or with its angle set. */
export type EntanglerUse =
  | { kind: 'cx-like'; entangler: Entangler; frame: Canonical }
  | { kind: 'adjustable'; entangler: Entangler; slope: number }
  | { kind: 'other'; entangler: Entangler };

export function entanglerUse(entangler: Entangler): EntanglerUse {
  if (entangler.angle === 'free') {
    // the first coordinate grows in proportion to the angle for the interactions of the table
    const small = 0.1;
    const [c1, c2, c3] = canonical(entanglerMatrix(entangler, small)).c;
    const isOneAxis = c2 < WALL_TOLERANCE && Math.abs(c3) < WALL_TOLERANCE;
    return isOneAxis
      ? { kind: 'adjustable', entangler, slope: c1 / small }
      : { kind: 'other', entangler };
  }
  const frame = canonical(entanglerMatrix(entangler));
  const [c1, c2, c3] = frame.c;
  const isCx =
    Math.abs(c1 - QUARTER) < WALL_TOLERANCE && c2 < WALL_TOLERANCE && Math.abs(c3) < WALL_TOLERANCE;
  return isCx ? { kind: 'cx-like', entangler, frame } : { kind: 'other', entangler };
}

/**
 * The open angles that one more use of the entangler brings to a circuit, at most 6: the single-wire rotations before it,
 * less those that pass it as single-wire rotations, and its own angle. 4 for a CX.
 */
export function anglesEach(entangler: Entangler): number {
  const e = entanglerMatrix(entangler, 0.7);
  const { X, Y, Z, I } = PAULI;
  const singles = [X, Y, Z].flatMap((p) => [kron(p, I, 2, 2), kron(I, p, 2, 2)]);
  const pairs = [X, Y, Z].flatMap((p) => [X, Y, Z].map((q) => kron(p, q, 2, 2)));
  // how much of each single-wire generator becomes a two-wire one
  const rows = singles.map((p) => {
    const moved = mul(e, mul(p, adjoint(e, 4), 4), 4);
    return pairs.map((q) => q.reduce((sum, x, k) => sum + x * moved[k]!, 0) / 4);
  });
  const gram = new Float64Array(72);
  rows.forEach((a, i) => {
    rows.forEach((b, j) => {
      gram[i * 6 + j] = a.reduce((sum, x, k) => sum + x * b[k]!, 0);
    });
  });
  const rank = hermitianEigen(gram, 6).values.filter((x) => x > 1e-9).length;
  return rank + (entangler.angle === 'free' ? 1 : 0);
}

/** Axes of rotations that pass an entangler on its first and second wire, with the sign they have after it. */
export type Passing = readonly ({ axis: Axis; sign: 1 | -1 } | null)[];

export function passingOf(entangler: Entangler): Passing {
  const e = entanglerMatrix(entangler, 0.7);
  return [0, 1].map((side) => {
    for (const axis of ['z', 'x', 'y'] as const) {
      const p = PAULI[axis.toUpperCase() as 'X' | 'Y' | 'Z'];
      const wide = side === 0 ? kron(p, PAULI.I, 2, 2) : kron(PAULI.I, p, 2, 2);
      // e p e^dag = +-p
      const moved = mul(e, mul(wide, adjoint(e, 4), 4), 4);
      const overlap = wide.reduce((sum, x, k) => sum + x * moved[k]!, 0) / 4;
      if (Math.abs(Math.abs(overlap) - 1) < 1e-12) return { axis, sign: overlap > 0 ? 1 : -1 };
    }
    return null;
  });
}

/** Fewest uses of the entangler for this gate, or undefined where this file cannot tell. */
export function usesNeeded(u: Float64Array, use: EntanglerUse): number | undefined {
  const { c } = canonical(u);
  if (use.kind === 'cx-like') return cxCount(c);
  if (use.kind === 'adjustable') return c.filter((x) => Math.abs(x) > WALL_TOLERANCE).length;
  return fittedCore(c, use.entangler)?.filter(({ wires }) => wires.length === 2).length;
}

/** The gate in uses of the entangler and single-wire unitaries; undefined for entanglers of other classes. */
export function twoWireGates(u: Float64Array, use: EntanglerUse): GateOperation[] | undefined {
  const wanted = canonical(u);
  const core = coreFor(wanted.c, use);
  if (!core) return undefined;
  if (core.length === 0) {
    // a product: both local layers at once
    return local(mul(wanted.a1, wanted.b1, 2), mul(wanted.a2, wanted.b2, 2));
  }
  const made = canonical(matrixOf(core));
  // u = A N B, core = A' N B'
  const before = local(
    mul(adjoint(made.b1, 2), wanted.b1, 2),
    mul(adjoint(made.b2, 2), wanted.b2, 2),
  );
  const after = local(
    mul(wanted.a1, adjoint(made.a1, 2), 2),
    mul(wanted.a2, adjoint(made.a2, 2), 2),
  );
  return [...before, ...core, ...after];
}

function local(first: Float64Array, second: Float64Array): GateOperation[] {
  return [unitaryGate(first, [0]), unitaryGate(second, [1])];
}

function matrixOf(operations: readonly GateOperation[]): Float64Array {
  const out = identity(4);
  for (const operation of operations) applyGateInto(out, operation, 2, 4);
  return out;
}

function coreFor(
  [c1, c2, c3]: readonly [number, number, number],
  use: EntanglerUse,
): GateOperation[] | undefined {
  if (Math.max(c1, c2, Math.abs(c3)) < WALL_TOLERANCE) return [];
  if (use.kind === 'adjustable') return adjustableCore([c1, c2, c3], use);
  if (use.kind !== 'cx-like') return fittedCore([c1, c2, c3], use.entangler);
  const cx = (): GateOperation[] => asCx(use);
  const count = cxCount([c1, c2, c3]);
  if (count === 1) return cx();
  if (count === 2) {
    return [...cx(), gate('rx', [0], -2 * c1), gate('rz', [1], -2 * c2), ...cx()];
  }
  const reversed = cx().map((op) => ({ ...op, wires: op.wires.map((w) => 1 - w) }));
  return [
    ...reversed,
    gate('rz', [0], Math.PI / 2 - 2 * c3),
    gate('ry', [1], 2 * c1 - Math.PI / 2),
    ...cx(),
    gate('ry', [1], Math.PI / 2 - 2 * c2),
    ...reversed,
  ];
}

/** A CX on wires 0, 1 by one use of the entangler; bare when it is one. */
function asCx({ entangler, frame }: EntanglerUse & { kind: 'cx-like' }): GateOperation[] {
  const bare = useOf(entangler);
  if (!entangler.matrix && (entangler.name === 'cx' || entangler.name === 'CX')) return [bare];
  const cx = canonical(gateMatrix(gate('cx', [0, 1])));
  return [
    ...local(mul(adjoint(frame.b1, 2), cx.b1, 2), mul(adjoint(frame.b2, 2), cx.b2, 2)),
    bare,
    ...local(mul(cx.a1, adjoint(frame.a1, 2), 2), mul(cx.a2, adjoint(frame.a2, 2), 2)),
  ];
}

function useOf(entangler: Entangler, angle?: number): GateOperation {
  if (entangler.matrix) return unitaryGate(entangler.matrix, [0, 1], entangler.name);
  return angle === undefined ? gate(entangler.name, [0, 1]) : gate(entangler.name, [0, 1], angle);
}

/** exp(i c1 XX) exp(i c2 YY) exp(i c3 ZZ), each from one use with local gates around it. */
function adjustableCore(
  c: readonly [number, number, number],
  { entangler, slope }: EntanglerUse & { kind: 'adjustable' },
): GateOperation[] {
  const out: GateOperation[] = [];
  c.forEach((coordinate, axis) => {
    if (Math.abs(coordinate) < WALL_TOLERANCE) return;
    const piece = useOf(entangler, Math.abs(coordinate) / slope);
    const wanted = interaction(coordinate, axis);
    const [w, made] = [canonical(wanted), canonical(gateMatrix(piece))];
    out.push(
      ...local(mul(adjoint(made.b1, 2), w.b1, 2), mul(adjoint(made.b2, 2), w.b2, 2)),
      piece,
      ...local(mul(w.a1, adjoint(made.a1, 2), 2), mul(w.a2, adjoint(made.a2, 2), 2)),
    );
  });
  return out;
}

function interaction(coordinate: number, axis: number): Float64Array {
  return gateMatrix(gate(['rxx', 'ryy', 'rzz'][axis]!, [0, 1], -2 * coordinate));
}
