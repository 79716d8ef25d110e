/**
 * Writes any unitary in gates on one and two wires, without a search: the quantum Shannon decomposition.
 *
 * Shape: u is 2^n x 2^n, planar, n >= 1; the result is gates on wires 0 .. n-1 in order of time, equal to u up to a phase.
 * The gates on two wires are CX, CZ and unitaries on the last two wires.
 * Method: Shende, Bullock, Markov, IEEE TCAD 25, 1000 (2006), theorem 13: the cosine-sine decomposition makes u two
 * multiplexers around a multiplexed Ry; a multiplexer diag(g1, g2) is v (d + d^dag) w with g1 g2^dag = v d^2 v^dag. Both
 * optimisations of its appendix: the last CZ of each multiplexed Ry goes into the multiplexer after it, and each block
 * on the last two wires hands a diagonal on to the next, so that two CX are enough for all but the last. That makes
 * (23/48) 4^n - (3/2) 2^n + 4/3 CX for generic unitaries, n >= 2.
 * Changed: factors, multiplexers, diagonals and identities met on the way are taken as such, which costs less.
 * Cost: about 200 * 8^n flops. Fails: never for unitary input.
 */
import { assert } from '../assert.ts';
import { type GateOperation, gate, unitaryGate } from '../circuit/circuit.ts';
import { adjoint, mul } from '../numeric/complex-matrix.ts';
import { cosineSine, quartersOf } from '../numeric/cosine-sine.ts';
import { nearestUnitary } from '../numeric/nearest-unitary.ts';
import { unitaryEigen } from '../numeric/unitary-eigen.ts';
import { canonical, cxCount } from './canonical.ts';
import { flips, multiplexedRotation } from './multiplexed.ts';
import { factorsOf } from './structure.ts';

/** Entries below this count as zero when a block's structure is looked at. */
const ZERO = 1e-14;
/** What may be left of the third coordinate of a block that is written with two CX. */
const THIRD_MAX = 1e-13;

/** CX that the decomposition takes for a generic unitary on n >= 2 wires. */
export function shannonCount(wires: number): number {
  return (23 * 4 ** wires) / 48 - (3 * 2 ** wires) / 2 + 4 / 3;
}

export function shannonGates(u: Float64Array, wires: number): GateOperation[] {
  assert(u.length === 2 * 4 ** wires, () => `a matrix of ${u.length} numbers on ${wires} wires`);
  const all = Array.from({ length: wires }, (_, k) => k);
  return withTwoEach(piecesOf(u, all));
}

function piecesOf(u: Float64Array, wires: readonly number[]): GateOperation[] {
  const [target, ...rest] = wires;
  if (isScalar(u, 2 ** wires.length)) return [];
  if (wires.length <= 2) return [unitaryGate(u, wires)];
  const m = 2 ** rest.length;
  const [a, b, c, d] = quartersOf(u, m);
  if (isZero(b) && isZero(c)) return multiplexer(a, d, target!, rest);
  if (isZero(a) && isZero(d)) return [gate('x', [target!]), ...multiplexer(b, c, target!, rest)];
  const factors = factorsOf(u, wires.length);
  if (factors.length > 1) {
    return factors.flatMap(({ wires: own, matrix }) =>
      piecesOf(
        matrix,
        own.map((wire) => wires[wire]!),
      ),
    );
  }
  const { l1, l2, angles, r1, r2 } = cosineSine(u, m);
  const right = multiplexer(r1, r2, target!, rest);
  const turn = multiplexedRotation('y', target!, rest, angles.map((angle) => 2 * angle)); // biome-ignore format: one call
  const isPlain = isScalar(mul(l1, adjoint(l2, m), m), m);
  const left = isPlain
    ? [...flips('y', target!, rest, turn.open), ...multiplexer(l1, l2, target!, rest)]
    : multiplexer(l1, withSigns(l2, m, turn.open), target!, rest);
  return [...right, ...turn.operations, ...left];
}

/** diag(g1, g2), selected by `target`. */
function multiplexer(
  g1: Float64Array,
  g2: Float64Array,
  target: number,
  rest: readonly number[],
): GateOperation[] {
  const m = 2 ** rest.length;
  const product = mul(g1, adjoint(g2, m), m);
  const isDiagonal = isDiagonalMatrix(product, m);
  const { phases, vectors } = isDiagonal
    ? { phases: diagonalPhases(product, m), vectors: null }
    : unitaryEigen(product, m);
  // d = e^{i phase / 2} where the target is 0
  const turn = multiplexedRotation('z', target, rest, phases.map((phase) => -phase)); // biome-ignore format: one call
  const w = (vectors ? mul(adjoint(vectors, m), g2, m) : g2).slice();
  for (let i = 0; i < m; i++) {
    const [re, im] = [Math.cos(phases[i]! / 2), Math.sin(phases[i]! / 2)];
    for (let j = 0; j < m; j++) {
      const [x, y] = [w[i * m + j]!, w[m * m + i * m + j]!];
      w[i * m + j] = re * x - im * y;
      w[m * m + i * m + j] = re * y + im * x;
    }
  }
  return [
    ...piecesOf(nearestUnitary(w, m), rest),
    ...turn.operations,
    ...flips('z', target, rest, turn.open),
    ...(vectors ? piecesOf(vectors, rest) : []),
  ];
}

/** g times Z on every wire of the mask (least significant bit = last wire). */
function withSigns(g: Float64Array, m: number, mask: number): Float64Array {
  const isOdd = (bits: number): boolean => {
    let parity = 0;
    for (let x = bits; x > 0; x &= x - 1) parity ^= 1;
    return parity === 1;
  };
  return g.map((x, at) => (isOdd((at % m) & mask) ? -x : x));
}

function isZero(a: Float64Array): boolean {
  return a.every((x) => Math.abs(x) < ZERO);
}

function isDiagonalMatrix(a: Float64Array, m: number): boolean {
  return a.every((x, at) => Math.floor((at % (m * m)) / m) === at % m || Math.abs(x) < ZERO);
}

function isScalar(a: Float64Array, m: number): boolean {
  if (!isDiagonalMatrix(a, m)) return false;
  for (let k = 1; k < m; k++) {
    if (Math.abs(a[k * m + k]! - a[0]!) > ZERO) return false;
    if (Math.abs(a[m * m + k * m + k]! - a[m * m]!) > ZERO) return false;
  }
  return true;
}

function diagonalPhases(a: Float64Array, m: number): Float64Array {
  return Float64Array.from({ length: m }, (_, k) =>
    Math.atan2(a[m * m + k * m + k]!, a[k * m + k]!),
  );
}

/**
 * Joins blocks on one pair of wires that follow each other at once, and makes each but the last one fit for two CX: what stands
 * between two of them is diagonal on those wires or does not touch them, so that a diagonal passes.
 */
function withTwoEach(pieces: readonly GateOperation[]): GateOperation[] {
  const out: GateOperation[] = [];
  // by the place in the list of the block that takes it up
  const carried = new Map<number, Float64Array>();
  const isBlock = ({ name, wires }: GateOperation): boolean => name === 'unitary' && wires.length === 2; // biome-ignore format: one rule
  const nextBlock = (from: number, [first, second]: readonly number[]): number => {
    for (let k = from; k < pieces.length; k++) {
      const piece = pieces[k]!;
      if (isBlock(piece) && piece.wires[0] === first && piece.wires[1] === second) return k;
      if (!passes(piece, first!, second!)) return -1;
    }
    return -1;
  };
  pieces.forEach((piece, k) => {
    if (!isBlock(piece)) {
      out.push(piece);
      return;
    }
    const before = carried.get(k);
    const matrix = before ? mul(piece.matrix!, before, 4) : piece.matrix!; // a block carries its matrix
    const next = nextBlock(k + 1, piece.wires);
    if (next === k + 1) {
      carried.set(next, matrix);
      return;
    }
    const { diagonal, rest } =
      next < 0 ? { diagonal: null, rest: matrix } : withoutDiagonal(matrix);
    if (diagonal) carried.set(next, diagonal);
    out.push(unitaryGate(rest, piece.wires));
  });
  return out;
}

/** Whether a diagonal on two wires commutes with a gate: it is a control there, or elsewhere. */
function passes({ name, wires }: GateOperation, first: number, second: number): boolean {
  if (name === 'cz' || name === 'rz') return true;
  const moved = name === 'cx' ? wires.slice(1) : wires;
  return moved.every((wire) => wire !== first && wire !== second);
}

/**
 * u = diagonal * rest, where rest takes two CX: Shende, Bullock, Markov, PRA 70, 012310 (2004): tr(g) is real for g = v S v^T S,
 * S = Y x Y, and v = exp(-i a ZZ) u has tr(g) = e^{-2ia} p + e^{2ia} q. Where the class is so near to local that this fixes a
 * badly, u stays whole.
 */
function withoutDiagonal(u: Float64Array): { diagonal: Float64Array | null; rest: Float64Array } {
  if (cxCount(canonical(u).c) <= 2) return { diagonal: null, rest: u };
  const { p, q } = traces(u);
  const first = Math.atan2(p[1] + q[1], p[0] - q[0]) / 2;
  // the two roots in a quarter turn are equally good
  const rest = turned(u, first);
  if (Math.abs(canonical(rest).c[2]) > THIRD_MAX) return { diagonal: null, rest: u };
  return { diagonal: zz(first), rest };
}

/** tr(g) of exp(-i a ZZ) u in two parts, with the phase of u taken out. */
function traces(u: Float64Array): { p: [number, number]; q: [number, number] } {
  // M = u S u^T, S = antidiag(-1, 1, 1, -1); the trace takes the entries (k, 3-k) times S
  const signs = [-1, 1, 1, -1];
  const entry = (i: number, j: number): [number, number] => {
    let [re, im] = [0, 0];
    for (let k = 0; k < 4; k++) {
      const [a, b] = [u[i * 4 + k]!, u[16 + i * 4 + k]!];
      const [c, d] = [u[j * 4 + 3 - k]!, u[16 + j * 4 + 3 - k]!];
      re += signs[k]! * (a * c - b * d);
      im += signs[k]! * (a * d + b * c);
    }
    return [re, im];
  };
  const half = -determinantPhase(u) / 2;
  const turn = ([x, y]: [number, number], sign: number): [number, number] => [
    2 * sign * (Math.cos(half) * x - Math.sin(half) * y),
    2 * sign * (Math.cos(half) * y + Math.sin(half) * x),
  ];
  return { p: turn(entry(0, 3), -1), q: turn(entry(1, 2), 1) };
}

/** The phase of det(u), from the canonical form: its parts have determinant 1. */
function determinantPhase(u: Float64Array): number {
  return 4 * canonical(u).phase;
}

/** exp(i a ZZ). */
function zz(angle: number): Float64Array {
  const out = new Float64Array(32);
  for (let k = 0; k < 4; k++) {
    out[k * 5] = Math.cos(angle);
    out[16 + k * 5] = (k === 0 || k === 3 ? 1 : -1) * Math.sin(angle);
  }
  return out;
}

function turned(u: Float64Array, angle: number): Float64Array {
  return mul(zz(-angle), u, 4);
}
