/**
 * Factors a unitary into a chain of blocks, so that outputs leave before later inputs enter.
 *
 * Given an order of the outputs and, for each, the inputs it needs, the chain enters inputs as late as the
 * order allows, acts on the carriers that are present, and lets each output leave as soon as it is done.
 * Convention: carrier k is the wire on which input k enters; an output leaves on the carrier named with it.
 * Matrices act on their `wires`, first = most significant; within a stage blocks act on different wires.
 * Method: let X', Z' be the Paulis of the next output, pulled back to the carriers. A basis v_k of the upper
 * half of the spectrum of Z', and the vectors X' v_k in its lower half, are the rows (conjugated) of a
 * unitary A that carries Z', X' to the Paulis of one carrier, and the output leaves there; the rest is
 * U (A^dag x 1) = 1 x B, and B is factored next. Source: Schumacher, Westmoreland, Quantum Inf. Process. 4,
 * 13 (2005); that a nested order can always be had: Kretschmann, Werner, PRA 72, 062323 (2005).
 * Changed: X' between the two halves and the averaged B are replaced by their unitary polar factors, so the
 * same code gives a nearby chain when U is only nearly one. The basis v_k is free; it is turned so that A is as
 * near to the identity on the other carriers as it can be, which keeps simple blocks simple.
 * Cost: a few products of 2^n x 2^n matrices per output.
 * Fails: never; how far the chain is from U is told by `chainDistance`.
 */
import { assert } from '../assert.ts';
import { applyMatrixInto } from '../circuit/unitary.ts';
import { adjoint, identity, mul } from '../numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { hermitianEigen } from '../numeric/hermitian-eigen.ts';
import { polarFactor, svd } from '../numeric/svd.ts';
import {
  averageOver,
  bitOffsets,
  dependence,
  otherPlaces,
  type Residual,
  reducedPauli,
  splitOff,
  wholeResidual,
  withoutOutput,
} from './residual.ts';

export type ChainBlock = { wires: readonly number[]; matrix: Float64Array };
export type Leaving = { output: number; carrier: number };
export type ChainStage = {
  /** Inputs that enter before the blocks act. */
  enters: readonly number[];
  blocks: readonly ChainBlock[];
  leaves: readonly Leaving[];
};
export type Chain = { wires: number; stages: readonly ChainStage[] };

export type ChainPlan = {
  /** Outputs in the order in which they leave. */
  order: readonly number[];
  /** needs[output]: the inputs that must have entered before it leaves. */
  needs: readonly (readonly number[])[];
};

/** A pulled-back Pauli that depends on a carrier by less than this (squared) leaves it out of its block. */
export const DEPENDENCE_MIN = 1e-20;

/** The most carriers that are there at once. */
export function chainWidth(chain: Chain): number {
  let present = 0;
  let most = 0;
  for (const { enters, leaves } of chain.stages) {
    present += enters.length;
    most = Math.max(most, present);
    present -= leaves.length;
  }
  return most;
}

/** The stages of a plan without blocks: who enters, who leaves. Inputs nobody needs enter last. */
export function stagesOf(plan: ChainPlan, n: number): { enters: number[]; leaves: number[] }[] {
  const entered = new Set<number>();
  const stages: { enters: number[]; leaves: number[] }[] = [];
  plan.order.forEach((output, position) => {
    const enters = plan.needs[output]!.filter((input) => !entered.has(input));
    if (entered.size + enters.length <= position) {
      // nobody is left to carry this output: the next free input must come
      const free = Array.from({ length: n }, (_, k) => k).find((k) => !entered.has(k));
      if (free !== undefined) enters.push(free);
    }
    for (const input of enters) entered.add(input);
    if (enters.length > 0 || stages.length === 0) stages.push({ enters, leaves: [output] });
    else stages.at(-1)?.leaves.push(output);
  });
  return stages;
}

/**
 * The chain for u (planar, 2^n x 2^n) along the plan. `dependenceMin`: below this, squared, a pulled-back Pauli
 * counts as trivial on a carrier; raise it to the square of the noise for inexact chains.
 */
export function factorChain(
  u: Float64Array,
  n: number,
  plan: ChainPlan,
  dependenceMin = DEPENDENCE_MIN,
): Chain {
  let residual = wholeResidual(u, n);
  let present: number[] = [];
  const stages: ChainStage[] = [];
  for (const { enters, leaves } of stagesOf(plan, n)) {
    present = [...present, ...enters].sort((a, b) => a - b);
    const blocks: ChainBlock[] = [];
    const left: Leaving[] = [];
    for (const output of leaves) {
      const step = splitOutput(residual, output, present, dependenceMin);
      residual = withoutOutput(step.residual, output, step.carrier);
      blocks.push(step.block);
      left.push({ output, carrier: step.carrier });
      present = present.filter((carrier) => carrier !== step.carrier);
    }
    stages.push({ enters, blocks: joinBlocks(blocks), leaves: left });
  }
  assert(residual.outputs.length === 0, () => 'a chain plan must let every output leave');
  return { wires: n, stages };
}

/** The block that brings `output` to one of the present carriers, and the residual after it. */
function splitOutput(
  residual: Residual,
  output: number,
  present: readonly number[],
  dependenceMin: number,
): { block: ChainBlock; carrier: number; residual: Residual } {
  const wires = supportOf(residual, output, present, dependenceMin);
  const upright = outputFrame(
    reducedPauli(residual, output, 'Z', wires),
    reducedPauli(residual, output, 'X', wires),
    wires.length,
  );
  const { matrix, place } = turnToIdentity(upright, wires, output);
  return {
    block: { wires, matrix },
    carrier: wires[place]!,
    residual: splitOff(residual, matrix, wires),
  };
}

/** The present carriers on which a pulled-back Pauli of `output` acts; at least one. */
export function supportOf(
  residual: Residual,
  output: number,
  present: readonly number[],
  dependenceMin: number,
  paulis: readonly ('X' | 'Z')[] = ['Z', 'X'],
): number[] {
  const operators = paulis.map((pauli) => reducedPauli(residual, output, pauli, present));
  const strength = present.map((_, place) =>
    operators.reduce((sum, o) => sum + dependence(o, present.length, place), 0),
  );
  const wires = present.filter((_, place) => strength[place]! > dependenceMin);
  return wires.length > 0 ? wires : [present[strength.indexOf(Math.max(...strength))]!];
}

/** Rows <v_k| (upper half of Z), then <X v_k| (lower half): the output's Paulis sit on the first bit. */
export function outputFrame(z: Float64Array, x: Float64Array, k: number): Float64Array {
  const d = 2 ** k;
  const half = d / 2;
  const { vectors } = hermitianEigen(z, d);
  const lower = columns(vectors, d, 0, half);
  const upper = columns(vectors, d, half, d);
  // the part of X from the upper to the lower half, made unitary
  const bridge = mul(adjoint(lower, d, half), mul(x, upper, d, d, half), half, d, half);
  const carried = mul(lower, polarFactor(bridge, half), d, half, half);
  const out = new Float64Array(2 * d * d);
  for (let v = 0; v < half; v++) {
    for (let i = 0; i < d; i++) {
      out[v * d + i] = upper[i * half + v]!;
      out[d * d + v * d + i] = -upper[d * half + i * half + v]!;
      out[(half + v) * d + i] = carried[i * half + v]!;
      out[d * d + (half + v) * d + i] = -carried[d * half + i * half + v]!;
    }
  }
  return out;
}

/** Columns from .. to-1 of a d x d matrix. */
export function columns(a: Float64Array, d: number, from: number, to: number): Float64Array {
  const width = to - from;
  const out = new Float64Array(2 * d * width);
  for (let i = 0; i < d; i++) {
    for (let j = 0; j < width; j++) {
      out[i * width + j] = a[i * d + from + j]!;
      out[d * width + i * width + j] = a[d * d + i * d + from + j]!;
    }
  }
  return out;
}

/** Puts the first bit of `frame` on the carrier, and turns the others, so that the block is nearest to doing nothing. */
export function turnToIdentity(
  frame: Float64Array,
  wires: readonly number[],
  output: number,
  placeGiven?: number,
): { matrix: Float64Array; place: number } {
  const k = wires.length;
  let best = { matrix: frame, place: 0, score: -1 };
  // the output's own carrier first: among equals the one that needs no relabelling
  const places = placeGiven === undefined ? wires.map((_, place) => place) : [placeGiven];
  places.sort((a, b) => Number(wires[b] === output) - Number(wires[a] === output) || a - b);
  for (const place of places) {
    // bits of the row index: the leaving one to its place, the others in order
    const rows = bitOffsets([place, ...otherPlaces([place], k)], k);
    const placed = permuteRows(frame, rows, 2 ** k);
    const mean = averageOver(placed, k, [place]);
    const { u, s, v } = svd(mean, 2 ** (k - 1));
    const score = s.reduce((sum, x) => sum + x, 0) / s.length;
    if (score <= best.score + 1e-9) continue;
    const turn = mul(v, adjoint(u, 2 ** (k - 1)), 2 ** (k - 1));
    const turned = applyMatrixInto(placed.slice(), turn, otherPlaces([place], k), k, 2 ** k);
    best = { matrix: turned, place, score };
  }
  return best;
}

/** Row r of the input becomes row target[r] of the output. */
function permuteRows(a: Float64Array, target: Int32Array, d: number): Float64Array {
  const out = new Float64Array(a.length);
  for (let r = 0; r < d; r++) {
    for (let half = 0; half < 2; half++) {
      const from = half * d * d + r * d;
      out.set(a.subarray(from, from + d), half * d * d + target[r]! * d);
    }
  }
  return out;
}

/** Multiplies blocks that share carriers together; what is left acts on different carriers. */
export function joinBlocks(blocks: readonly ChainBlock[]): ChainBlock[] {
  let joined: ChainBlock[] = [];
  for (const block of blocks) {
    const touching = joined.filter((other) => other.wires.some((w) => block.wires.includes(w)));
    const wires = [...new Set([...touching, block].flatMap((b) => b.wires))].sort((a, b) => a - b);
    let matrix: Float64Array = identity(2 ** wires.length);
    for (const part of [...touching, block]) {
      const places = part.wires.map((wire) => wires.indexOf(wire));
      matrix = applyMatrixInto(matrix, part.matrix, places, wires.length, 2 ** wires.length);
    }
    joined = [...joined.filter((other) => !touching.includes(other)), { wires, matrix }];
  }
  return joined;
}

/** The carrier on which each output leaves. */
export function carriersOfOutputs(chain: Chain): number[] {
  const carrierOf = new Array<number>(chain.wires).fill(-1);
  for (const { leaves } of chain.stages) {
    for (const { output, carrier } of leaves) carrierOf[output] = carrier;
  }
  return carrierOf;
}

/** u with its outputs relabelled by the carriers on which the chain lets them leave. */
export function onCarriers(u: Float64Array, chain: Chain): Float64Array {
  const n = chain.wires;
  const rows = bitOffsets(carriersOfOutputs(chain), n);
  return permuteRows(u, rows, 2 ** n);
}

/** The chain's blocks in order, as one list. */
export function chainBlocks(chain: Chain): ChainBlock[] {
  return chain.stages.flatMap(({ blocks }) => blocks);
}

/** The unitary from carriers to carriers that the blocks make together. */
export function blocksUnitary(blocks: readonly ChainBlock[], n: number): Float64Array {
  const out = identity(2 ** n);
  for (const { matrix, wires } of blocks) applyMatrixInto(out, matrix, wires, n, 2 ** n);
  return out;
}

/** D between u and what the chain does. */
export function chainDistance(u: Float64Array, chain: Chain): number {
  const made = blocksUnitary(chainBlocks(chain), chain.wires);
  return hilbertSchmidtDistance(onCarriers(u, chain), made).distance;
}

/** True when a block does nothing but a phase, to `tolerance` in D. */
export function isIdle({ matrix, wires }: ChainBlock, tolerance = 1e-14): boolean {
  return hilbertSchmidtDistance(identity(2 ** wires.length), matrix).distance <= tolerance;
}
