/**
 * Proves a difference between circuits of any size when all but a few of their gates are the same.
 *
 * Method: what both end with, up to commutation, is taken out of both (`cancel` of `gate-by-gate.ts` on the reversed lists). What
 * is left comes first, acts on few lines, and is compared as a matrix W = A^dagger B there; D of the circuits is D of these.
 * Proves: both ways, when all inputs are free and all outputs are kept. The witness is the basis state, or one with a single
 * line in |+>, that comes back least often.
 */
import { applyMatrixInto } from '../circuit/unitary.ts';
import { adjoint, identity, mul } from '../numeric/complex-matrix.ts';
import { distanceAngle, hilbertSchmidtDistance } from '../numeric/distance.ts';
import { cancel } from './gate-by-gate.ts';
import type { LineGate } from './lines.ts';
import type { Sides } from './sides.ts';

const LINES_MAX = 8;
const GATES_MAX = 4000;
/** Gates that count as the same may differ by this angle; their sum is the error bar of the angle. */
const EQUAL_ANGLE = 1e-12;

export type LocalDifference = {
  hilbertSchmidt: number;
  /** Up to this much more or less, from the gates that were taken for the same. */
  errorBar: number;
  cancelled: number;
  rest: number;
  /** Lines that start in |1>, and in |+>; all others in |0>. */
  input: { one: number[]; plus: number[] };
  /** Probability to find that input again after the one circuit and the inverse of the other. */
  again: number;
};

/** Null where this road does not lead: the contract sees less, or too much is left over. */
export function localDifference({
  left,
  right,
  isWhole,
  zeroLines,
}: Sides): LocalDifference | null {
  if (!isWhole || zeroLines.length > 0 || left.length + right.length > GATES_MAX) return null;
  const mirrored = cancel([...left].reverse(), [...right].reverse(), EQUAL_ANGLE);
  const [restLeft, restRight] = [mirrored.restLeft.reverse(), mirrored.restRight.reverse()];
  const all = [...new Set([...restLeft, ...restRight].flatMap(({ lines }) => lines))].sort((x, y) => x - y); // biome-ignore format: one list
  if (all.length === 0 || all.length > LINES_MAX) return null;
  const d = 2 ** all.length;
  const [a, b] = [restLeft, restRight].map((gates) => matrixOf(gates, all)) as [Float64Array, Float64Array]; // biome-ignore format: a pair
  const { distance } = hilbertSchmidtDistance(a, b);
  const w = mul(adjoint(a, d), b, d);
  const angle = distanceAngle(distance);
  const high = 2 * Math.sin(Math.min(Math.PI / 2, angle + mirrored.angle) / 2) ** 2;
  return {
    hilbertSchmidt: distance,
    errorBar: Math.max(high - distance, 1e-15 * (restLeft.length + restRight.length + 1)),
    cancelled: mirrored.pairs,
    rest: restLeft.length + restRight.length,
    ...leastComingBack(w, all),
  };
}

function matrixOf(gates: readonly LineGate[], all: readonly number[]): Float64Array {
  const d = 2 ** all.length;
  const out = identity(d);
  for (const { lines, matrix } of gates) {
    applyMatrixInto(out, matrix, lines.map((line) => all.indexOf(line)), all.length, d); // biome-ignore format: one call
  }
  return out;
}

function leastComingBack(
  w: Float64Array,
  all: readonly number[],
): Pick<LocalDifference, 'input' | 'again'> {
  const n = all.length;
  const d = 2 ** n;
  const at = (r: number, c: number): [number, number] => [w[r * d + c]!, w[d * d + r * d + c]!];
  const ones = (state: number): number[] => all.filter((_, k) => (state >> (n - 1 - k)) & 1);
  let best = {
    again: Number.POSITIVE_INFINITY,
    input: { one: [] as number[], plus: [] as number[] },
  };
  const consider = (again: number, one: number[], plus: number[]): void => {
    if (again < best.again - 1e-12) best = { again, input: { one, plus } };
  };
  for (let s = 0; s < d; s++) {
    const [re, im] = at(s, s);
    consider(re * re + im * im, ones(s), []);
  }
  for (const [k, line] of all.entries()) {
    const bit = 2 ** (n - 1 - k);
    for (let s = 0; s < d; s++) {
      if (s & bit) continue;
      const list = [at(s, s), at(s, s + bit), at(s + bit, s), at(s + bit, s + bit)];
      const re = list.reduce((sum, [x]) => sum + x / 2, 0);
      const im = list.reduce((sum, [, y]) => sum + y / 2, 0);
      consider(re * re + im * im, ones(s), [line]);
    }
  }
  return best;
}
