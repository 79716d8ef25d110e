/**
 * Writes unitaries with structure in gates on one and two wires by taking the structure apart.
 *
 * Shape: as `synthesise.ts`; whole unitaries on three wires and more. Gates on two wires are of any class.
 * Method, the first that applies (`structure.ts` recognises, to 1e-12):
 *   factors on separate wires   each built on its own
 *   a diagonal                  a sum of parities (`diagonal.ts`)
 *   a permutation with phases   the phases, then NOT gates with controls (`permutation.ts`)
 *   a wire that only selects, up to a basis before and after it and an exchange of two outputs:
 *     diag(g1, g2) = (1 x g1) diag(1, g1^dag g2), or diag(1, g2 g1^dag) first, where that is diagonal or has factors;
 *     else (1 x v)(d + d^dag)(1 x w) with g1 g2^dag = v d^2 v^dag (Shende, Bullock, Markov, IEEE TCAD 25, 1000 (2006), theorem 12).
 * The parts are built by `build`, which comes back here for those with structure of their own.
 * Result: the gates and a sentence that names the structure; undefined where there is none.
 */
import { type GateOperation, gate, onWires, unitaryGate } from '../circuit/circuit.ts';
import { adjoint, identity, mul } from '../numeric/complex-matrix.ts';
import { fromQuarters } from '../numeric/cosine-sine.ts';
import { nearestUnitary } from '../numeric/nearest-unitary.ts';
import { unitaryEigen } from '../numeric/unitary-eigen.ts';
import { diagonalGates, isDiagonal } from './diagonal.ts';
import { flips, multiplexedRotation } from './multiplexed.ts';
import { permutationGates } from './permutation.ts';
import { type Factor, factorsOf, monomialOf, type Selection, selectionOn } from './structure.ts';

export type Structured = {
  operations: GateOperation[];
  /** What was recognised, as a sentence. */
  note: string;
  /** Nothing is to be gained by fitting it anew: its parts are as short as they get by themselves. */
  isFinal: boolean;
};

/** Builds a part on its own wires; `of` are the wires of the whole. */
export type BuildPart = (matrix: Float64Array, of: readonly number[]) => Promise<GateOperation[]>;

export async function structuredGates(
  u: Float64Array,
  wires: number,
  build: BuildPart,
): Promise<Structured | undefined> {
  const factors = factorsOf(u, wires);
  if (factors.length > 1) {
    const groups = factors.map((factor) => factor.wires.join(',')).join(' | ');
    return {
      operations: await built(factors, build),
      note: `a product of factors on ${groups}`,
      isFinal: true,
    };
  }
  if (isDiagonal(u, wires)) {
    return {
      operations: diagonalGates(u, wires),
      note: 'diagonal: a sum of parities',
      isFinal: true,
    };
  }
  const monomial = monomialOf(u, wires);
  if (monomial) {
    const phases = diagonalGates(diagonalOf(monomial.phases), wires);
    const moves = permutationGates(monomial.to, wires);
    // CX alone: the fewest, or nearly
    const isFinal = phases.length === 0 && moves.every(({ wires: own }) => own.length <= 2);
    return {
      operations: [...phases, ...moves],
      note: 'a permutation of basis states, up to phases',
      isFinal,
    };
  }
  return selected(u, wires, build);
}

async function built(factors: readonly Factor[], build: BuildPart): Promise<GateOperation[]> {
  const parts: GateOperation[] = [];
  for (const { wires, matrix } of factors) {
    parts.push(...onWires(await build(matrix, wires), wires));
  }
  return parts;
}

function diagonalOf(phases: ArrayLike<number>): Float64Array {
  const d = phases.length;
  const out = new Float64Array(2 * d * d);
  for (let k = 0; k < d; k++) {
    out[k * (d + 1)] = Math.cos(phases[k]!);
    out[d * d + k * (d + 1)] = Math.sin(phases[k]!);
  }
  return out;
}

type Found = { selection: Selection; swap: readonly [number, number] | null };

/** The first wire that selects, without an exchange of outputs if possible; wires whose rest is simple go first. */
function selectionOf(u: Float64Array, wires: number): Found | undefined {
  const found: Found[] = [];
  for (let wire = 0; wire < wires; wire++) {
    const selection = selectionOn(u, wires, wire);
    if (selection) found.push({ selection, swap: null });
  }
  const simple = found.find(({ selection }) => simpleRest(selection, wires - 1) !== undefined);
  if (simple || found[0]) return simple ?? found[0];
  const d = 2 ** wires;
  for (let a = 0; a < wires; a++) {
    for (let b = 0; b < wires; b++) {
      if (a === b) continue;
      // u = swap * v: the rows of v are those of u with two bits exchanged
      const exchanged = new Float64Array(u.length);
      for (let row = 0; row < d; row++) {
        const from = withBitsExchanged(row, wires - 1 - a, wires - 1 - b);
        exchanged.set(u.subarray(from * d, (from + 1) * d), row * d);
        exchanged.set(u.subarray(d * d + from * d, d * d + (from + 1) * d), d * d + row * d);
      }
      const selection = selectionOn(exchanged, wires, a);
      if (selection) return { selection, swap: [a, b] };
    }
  }
  return undefined;
}

function withBitsExchanged(x: number, a: number, b: number): number {
  return ((x >> a) & 1) === ((x >> b) & 1) ? x : x ^ ((1 << a) | (1 << b));
}

/** Which of g1^dag g2 and g2 g1^dag is diagonal or has factors. */
function simpleRest(
  { g1, g2 }: Selection,
  wires: number,
): { isFirst: boolean; rest: Float64Array; factors: Factor[] } | undefined {
  const m = 2 ** wires;
  const options = [
    { isFirst: true, rest: mul(adjoint(g1, m), g2, m) },
    { isFirst: false, rest: mul(g2, adjoint(g1, m), m) },
  ];
  const diagonal = options.find(({ rest }) => isDiagonal(rest, wires));
  if (diagonal) return { ...diagonal, factors: [] };
  for (const option of options) {
    const factors = factorsOf(option.rest, wires);
    if (factors.length > 1) return { ...option, factors };
  }
  return undefined;
}

async function selected(
  u: Float64Array,
  wires: number,
  build: BuildPart,
): Promise<Structured | undefined> {
  const found = selectionOf(u, wires);
  if (!found) return undefined;
  const { selection, swap } = found;
  const { wire, a, b } = selection;
  const rest = Array.from({ length: wires }, (_, k) => k).filter((k) => k !== wire);
  const inner = await multiplexer(selection, rest, build);
  const operations = [
    unitaryGate(b, [wire]),
    ...inner,
    unitaryGate(a, [wire]),
    ...(swap ? [gate('swap', swap)] : []),
  ];
  const isControl = isScalar(selection.g1) || isScalar(selection.g2);
  const verb = isControl ? 'controls' : 'selects';
  const exchange = swap ? `, with outputs ${swap.join(' and ')} exchanged` : '';
  const note = `wire ${wire} ${verb} what happens to the others${exchange}`;
  return { operations, note, isFinal: false };
}

function isScalar(g: Float64Array): boolean {
  const half = g.length / 2;
  const m = Math.sqrt(half);
  if (!isDiagonal(g, Math.log2(m))) return false;
  for (let at = 0; at < half; at += m + 1) {
    if (Math.hypot(g[at]! - g[0]!, g[half + at]! - g[half]!) > 1e-12) return false;
  }
  return true;
}

async function multiplexer(
  selection: Selection,
  rest: readonly number[],
  build: BuildPart,
): Promise<GateOperation[]> {
  const { wire, g1, g2 } = selection;
  const m = 2 ** rest.length;
  const simple = simpleRest(selection, rest.length);
  if (simple) {
    const first = onWires(await build(g1, rest), rest);
    const control: GateOperation[] = [];
    if (simple.factors.length === 0) {
      const phases = new Float64Array(2 * m);
      for (let k = 0; k < m; k++) {
        const at = k * (m + 1);
        phases[m + k] = Math.atan2(simple.rest[m * m + at]!, simple.rest[at]!);
      }
      const own = [wire, ...rest];
      control.push(...onWires(diagonalGates(diagonalOf(phases), own.length), own));
    }
    for (const { wires, matrix } of simple.factors) {
      const own = [wire, ...wires.map((k) => rest[k]!)];
      const size = 2 ** wires.length;
      const controlled = fromQuarters([identity(size), null, null, matrix], size);
      control.push(...onWires(await build(controlled, own), own));
    }
    return simple.isFirst ? [...control, ...first] : [...first, ...control];
  }
  const { phases, vectors } = unitaryEigen(mul(g1, adjoint(g2, m), m), m);
  const half = diagonalOf(phases.map((phase) => phase / 2));
  const w = nearestUnitary(mul(half, mul(adjoint(vectors, m), g2, m), m), m);
  const turn = multiplexedRotation('z', wire, rest, phases.map((phase) => -phase)); // biome-ignore format: one call
  return [
    ...onWires(await build(w, rest), rest),
    ...turn.operations,
    ...flips('z', wire, rest, turn.open),
    ...onWires(await build(nearestUnitary(vectors, m), rest), rest),
  ];
}
