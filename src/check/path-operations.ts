/**
 * Writes gates on lines as what a sum over paths is made of: phases, affine maps of the basis states, Hadamards.
 *
 * Method: a gate that permutes basis states by an affine map up to phases is that map and a diagonal. A gate with controls on
 * all its lines but one, whose blocks have a common eigenbasis, is a diagonal between two turns of that line; a gate on a few
 * lines that a Clifford basis change on each makes diagonal is one between those. A turn of one line is Z H Z when its entries
 * all have the same size, else Z H Z H Z (Euler angles about Z, X, Z: X = H Z H).
 * Result: null for a gate that is none of these. Global phases are dropped.
 * Source: the phase polynomials and path sums of Amy, Maslov, Mosca (IEEE TCAD 33, 1476 (2014)) and Amy (EPTCS 287, 1 (2019)).
 */
import { adjoint, kron, mul } from '../numeric/complex-matrix.ts';
import type { LineGate } from './lines.ts';

/** Phases are in radians per basis state of the lines, first line = most significant; `image[s]` is where state s goes. */
export type PathOperation =
  | { kind: 'phases'; lines: readonly number[]; phases: Float64Array }
  | { kind: 'map'; lines: readonly number[]; image: Int32Array }
  | { kind: 'hadamard'; line: number };

const TINY = 1e-12;
/** Basis changes are tried up to this many lines. */
const BASIS_LINES_MAX = 3;

const R = Math.SQRT1_2;
const HADAMARD = Float64Array.of(R, R, R, -R, 0, 0, 0, 0);
/** Takes the eigenvectors of Y to basis states: H times the inverse of S. */
const FROM_Y = Float64Array.of(R, 0, R, 0, 0, -R, 0, R);
const IDENTITY = Float64Array.of(1, 0, 0, 1, 0, 0, 0, 0);

export function pathOperations({ lines, matrix }: LineGate): PathOperation[] | null {
  return (
    mapAndPhases(lines, matrix) ??
    (lines.length === 1 ? turn(lines[0]!, matrix) : null) ??
    controlled(lines, matrix) ??
    inOtherBasis(lines, matrix)
  );
}

/** The operations of the inverse. */
export function inverted(operations: readonly PathOperation[]): PathOperation[] {
  return operations.map(inverseOf).reverse();
}

function inverseOf(operation: PathOperation): PathOperation {
  if (operation.kind === 'hadamard') return operation;
  if (operation.kind === 'phases') {
    return { ...operation, phases: operation.phases.map((phase) => -phase) };
  }
  const image = new Int32Array(operation.image.length);
  operation.image.forEach((to, from) => {
    image[to] = from;
  });
  return { ...operation, image };
}

function size(matrix: Float64Array, k: number): number {
  return Math.hypot(matrix[k]!, matrix[matrix.length / 2 + k]!);
}

/** In (-pi, pi], with -pi and what rounding makes of it as pi. */
function phaseAt(matrix: Float64Array, k: number): number {
  const phase = Math.atan2(matrix[matrix.length / 2 + k]!, matrix[k]!);
  return phase < -Math.PI + 1e-9 ? phase + 2 * Math.PI : phase;
}

function mapAndPhases(lines: readonly number[], matrix: Float64Array): PathOperation[] | null {
  const d = 2 ** lines.length;
  const image = new Int32Array(d).fill(-1);
  const phases = new Float64Array(d);
  for (let c = 0; c < d; c++) {
    for (let r = 0; r < d; r++) {
      if (size(matrix, r * d + c) <= TINY) continue;
      if (image[c]! >= 0) return null;
      image[c] = r;
      phases[c] = exact(phaseAt(matrix, r * d + c));
    }
  }
  if (!isAffine(image)) return null;
  const isMoving = image.some((to, from) => to !== from);
  const isTurning = phases.some((phase) => Math.abs(phase - phases[0]!) > 0);
  return [
    ...(isTurning ? [{ kind: 'phases', lines, phases } as const] : []),
    ...(isMoving ? [{ kind: 'map', lines, image } as const] : []),
  ];
}

function isAffine(image: Int32Array): boolean {
  const [base] = image;
  return image.every((to, from) => {
    let sum = base!;
    for (let bit = 1; bit < image.length; bit *= 2) if (from & bit) sum ^= image[bit]! ^ base!;
    return to === sum;
  });
}

/** A unitary on one line that is neither diagonal nor a flip. */
function turn(line: number, u: Float64Array): PathOperation[] {
  const phases = (angle: number): PathOperation[] =>
    angle === 0 ? [] : [{ kind: 'phases', lines: [line], phases: Float64Array.of(0, angle) }];
  const hadamard: PathOperation = { kind: 'hadamard', line };
  const [p00, p01, p10, p11] = [0, 1, 2, 3].map((k) => phaseAt(u, k)) as [number, number, number, number]; // biome-ignore format: one list
  // all sizes equal: diag(1, a) H diag(1, b) up to a phase, with p11 = p10 + p01 - p00 + pi
  if (Math.abs(size(u, 0) - R) < TINY) {
    return [...phases(exact(p01 - p00)), hadamard, ...phases(exact(p10 - p00))];
  }
  // Z(a) X(t) Z(b): entries cos(t/2) e^{-i(a+b)/2}, -i sin(t/2) e^{-i(a-b)/2}, -i sin(t/2) e^{i(a-b)/2}, cos(t/2) e^{i(a+b)/2}
  const t = 2 * Math.atan2(size(u, 2), size(u, 0));
  const sum = p11 - p00;
  const difference = p10 - p01;
  const [a, b] = [(sum + difference) / 2, (sum - difference) / 2];
  // halves are known up to pi together: the phase of the lower left against the upper left entry tells
  const wanted = p10 - p00;
  const isOff = Math.cos(wanted - (a - Math.PI / 2)) < 0;
  return [
    ...phases(exact(isOff ? b + Math.PI : b)),
    hadamard,
    ...phases(exact(t)),
    hadamard,
    ...phases(exact(isOff ? a + Math.PI : a)),
  ];
}

/** Multiples of pi/4 without their last bits of rounding, so that sums of them stay exact. */
function exact(angle: number): number {
  const steps = Math.round(angle / (Math.PI / 4));
  return Math.abs(angle - (steps * Math.PI) / 4) < 1e-14 ? (steps * Math.PI) / 4 : angle;
}

/** Blocks with a common eigenbasis on one line, the others being controls. */
function controlled(lines: readonly number[], matrix: Float64Array): PathOperation[] | null {
  for (const [k, line] of lines.entries()) {
    const basis = commonBasis(matrix, lines.length, k);
    if (!basis) continue;
    const place = lines.map((_, at) => (at === k ? basis : IDENTITY));
    const found = between(lines, matrix, place);
    if (found)
      return [...inverted(found.turn(line, basis)), found.phases, ...found.turn(line, basis)];
  }
  return null;
}

/** Eigenvectors (as columns) of the first block that is no multiple of the identity; null where the line is not a target. */
function commonBasis(matrix: Float64Array, n: number, k: number): Float64Array | null {
  const d = 2 ** n;
  const bit = 2 ** (n - 1 - k);
  for (let s = 0; s < d; s++) {
    if (s & bit) continue;
    const at = [s * d + s, s * d + s + bit, (s + bit) * d + s, (s + bit) * d + s + bit];
    const b = at.map((index): [number, number] => [matrix[index]!, matrix[d * d + index]!]);
    const isUnitary = Math.abs(Math.hypot(...b[0]!, ...b[2]!) - 1) < 1e-9;
    if (!isUnitary) return null;
    const isScalar = Math.hypot(...b[1]!) < TINY && Math.hypot(b[0]![0] - b[3]![0], b[0]![1] - b[3]![1]) < TINY; // biome-ignore format: one condition
    if (!isScalar) return eigenvectors(b as [Complex, Complex, Complex, Complex]);
  }
  return null;
}

type Complex = [number, number];

/** Of a unitary 2 x 2: its axis on the Bloch sphere, from the part without trace. */
function eigenvectors([p, q, r, s]: [Complex, Complex, Complex, Complex]): Float64Array {
  // e^{i f} (c - i v.sigma): with the phase of the determinant taken out, -i v_z = (p - s)/2 and so on
  const determinant: Complex = [p[0] * s[0] - p[1] * s[1] - q[0] * r[0] + q[1] * r[1], p[0] * s[1] + p[1] * s[0] - q[0] * r[1] - q[1] * r[0]]; // biome-ignore format: one formula
  const half = Math.atan2(determinant[1], determinant[0]) / 2;
  const unturned = ([re, im]: Complex): Complex => [re * Math.cos(half) + im * Math.sin(half), im * Math.cos(half) - re * Math.sin(half)]; // biome-ignore format: one formula
  const [a, b, c, d] = [unturned(p), unturned(q), unturned(r), unturned(s)];
  const [x, y, z] = [-(b[1] + c[1]) / 2, (c[0] - b[0]) / 2, (d[1] - a[1]) / 2];
  const theta = Math.atan2(Math.hypot(x, y), z);
  const phi = Math.atan2(y, x);
  const [cos, sin] = [Math.cos(theta / 2), Math.sin(theta / 2)];
  const [re, im] = [Math.cos(phi), Math.sin(phi)];
  return Float64Array.of(cos, -sin * re, sin * re, cos, 0, sin * im, sin * im, 0);
}

type Between = {
  phases: PathOperation;
  turn(line: number, basis: Float64Array): PathOperation[];
};

/** The gate as a diagonal between basis changes (columns of each `basis`), or null. */
function between(
  lines: readonly number[],
  matrix: Float64Array,
  bases: readonly Float64Array[],
): Between | null {
  const d = 2 ** lines.length;
  const all = bases.reduce((product, basis, k) => (k === 0 ? basis : kron(product, basis, 2 ** k, 2))); // biome-ignore format: one product
  const inside = mul(mul(adjoint(all, d), matrix, d), all, d);
  for (let r = 0; r < d; r++) {
    for (let c = 0; c < d; c++) if (r !== c && size(inside, r * d + c) > 1e-11) return null;
  }
  const phases = Float64Array.from({ length: d }, (_, s) => exact(phaseAt(inside, s * d + s)));
  return {
    phases: { kind: 'phases', lines, phases },
    turn: (line, basis) => mapAndPhases([line], basis) ?? turn(line, basis),
  };
}

function inOtherBasis(lines: readonly number[], matrix: Float64Array): PathOperation[] | null {
  if (lines.length > BASIS_LINES_MAX) return null;
  const choices = [IDENTITY, HADAMARD, adjoint(FROM_Y, 2)];
  for (let choice = 1; choice < choices.length ** lines.length; choice++) {
    const bases = lines.map((_, k) => choices[Math.floor(choice / choices.length ** k) % choices.length]!); // biome-ignore format: one list
    const found = between(lines, matrix, bases);
    if (!found) continue;
    const after = lines.flatMap((line, k) => found.turn(line, bases[k]!));
    const before = lines.flatMap((line, k) => inverted(found.turn(line, bases[k]!)));
    return [...before, found.phases, ...after];
  }
  return null;
}
