/**
 * Turns the blocks of a chain into entanglers and rotations, in an order that the chain allows.
 *
 * Blocks are fitted one by one as long as the rest of the chain is large: V is fitted so that V^dag P V equals the
 * block's pulled-back Paulis of the carriers that go no further; the unitary on the others by which V and the
 * block then differ joins the next block. The rest is fitted at once as soon as it is small, so that the
 * freedom between its blocks is used in full (a generic chain of two 3-wire blocks on 4 wires: 25 CX, the
 * dimension bound). A block that does not fit, or has more than `FIT_WIRES_MAX` wires, stays a matrix.
 * Result: gates on carriers in order; `distance` is D between them and the chain's target, computed anew.
 */

import { type GateOperation, gate, onWires, unitaryGate } from '../circuit/circuit.ts';
import { applyGateInto } from '../circuit/unitary.ts';
import { type Control, freeRunning } from '../control.ts';
import type { RunJobs } from '../jobs.ts';
import { adjoint, identity, mul } from '../numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { nearestUnitary } from '../numeric/nearest-unitary.ts';
import type { FitRow } from '../reports.ts';
import {
  blocksUnitary,
  type Chain,
  type ChainBlock,
  chainBlocks,
  isIdle,
  onCarriers,
} from './chain.ts';
import {
  type BlockNeed,
  blockNeeds,
  chainTemplates,
  entanglersNeeded,
  entanglersOfBlock,
} from './chain-templates.ts';
import { type Found, fewestEntanglers } from './fewest-entanglers.ts';
import type { FitTarget } from './fit-block.ts';
import { beamOfPlacements, type Pair, structuredDistance } from './placement-beam.ts';
import { averageOver, widen } from './residual.ts';
import {
  angleCount,
  type Entangler,
  entanglerTemplate,
  templateOperations,
  templateUnitary,
} from './template.ts';

/** What is left of a chain is fitted at once when it has no more carriers and blocks than this. */
const JOINT_WIRES_MAX = 4;
const JOINT_BLOCKS_MAX = 3;

/** Larger blocks would be fitted for minutes or hours: their matrices can be decomposed. */
const FIT_WIRES_MAX = 4;

/** Blocks are searched for structure up to this size and this many entanglers. */
const SIMPLE_WIRES_MAX = 3;
const SIMPLE_COUNT_MAX = 9;

export type FitChainOptions = {
  entangler: Entangler;
  seed: number;
  /** A fit counts as done at this D. */
  goal: number;
  runJobs: RunJobs;
  control?: Control;
};

export type ChainFit = {
  operations: GateOperation[];
  fits: FitRow[];
  distance: number;
};

export async function fitChain(
  u: Float64Array,
  chain: Chain,
  options: FitChainOptions,
): Promise<ChainFit> {
  const target = onCarriers(u, chain);
  const blocks = chainBlocks(chain).filter((block) => !isIdle(block));
  const { operations, fits } =
    (await fitSimpleBlocks(blocks, options)) ?? (await fitInTurn(blocks, options));
  return { operations, fits, distance: distanceTo(target, operations, chain.wires) };
}

/**
 * Blocks with structure of their own, each with far fewer entanglers than a generic block of its size; null as soon as one
 * is not of this kind. The factorisation keeps simple blocks simple, so this is what circuits written by hand end in.
 */
async function fitSimpleBlocks(
  blocks: readonly ChainBlock[],
  { entangler, seed, goal, runJobs, control = freeRunning }: FitChainOptions,
): Promise<{ operations: GateOperation[]; fits: FitRow[] } | null> {
  const operations: GateOperation[] = [];
  const fits: FitRow[] = [];
  for (const [b, { wires, matrix }] of blocks.entries()) {
    const k = wires.length;
    if (k > SIMPLE_WIRES_MAX || control.stopped()) return null;
    if (k <= 2) {
      operations.push(unitaryGate(matrix, wires, 'block'));
      continue;
    }
    const links = wires.flatMap((_, x) => wires.slice(x + 1).map((__, y): Pair => [x, x + 1 + y]));
    const { best } = await beamOfPlacements({
      label: `block ${b + 1}`,
      target: { kind: 'unitary', matrix },
      templateOf: (pairs) =>
        entanglerTemplate(
          k,
          pairs.map(([x, y]): [number, number] => [x, y]),
          entangler,
        ),
      tolerance: goal,
      seed,
      optimiser: 'lm',
      runJobs,
      control,
      links,
      countMax: SIMPLE_COUNT_MAX,
      farAt: structuredDistance,
    });
    if (!best) return null;
    const template = entanglerTemplate(
      k,
      best.pairs.map(([x, y]): [number, number] => [x, y]),
      entangler,
    );
    const local = templateOperations(template, best.angles);
    operations.push(...onWires(local, wires));
    const { pairs, iterations, distance, status } = best;
    fits.push({
      block: b,
      wires: [...wires],
      entanglers: pairs.length,
      iterations,
      distance,
      status,
    });
  }
  return { operations, fits };
}

function distanceTo(target: Float64Array, operations: readonly GateOperation[], n: number): number {
  const made = identity(2 ** n);
  for (const operation of operations) applyGateInto(made, operation, n, 2 ** n);
  return hilbertSchmidtDistance(target, made).distance;
}

/** One block after the other, the freedom of each handed on to the next; the rest at once as soon as it is small. */
async function fitInTurn(
  given: readonly ChainBlock[],
  options: FitChainOptions,
): Promise<{ operations: GateOperation[]; fits: FitRow[] }> {
  // a block's matrix changes when an earlier one hands its freedom on
  const blocks = given.map((block) => ({ ...block }));
  const needs = blockNeeds(blocks);
  const operations: GateOperation[] = [];
  const fits: FitRow[] = [];
  const keep = (found: Found, wires: readonly number[], index: number): void => {
    const fitted = placeFit(found, wires, index);
    operations.push(...fitted.operations);
    fits.push(fitted.fit);
  };
  for (const [b, block] of blocks.entries()) {
    const { wires, matrix } = block;
    const rest = blocks.slice(b);
    const all = [...new Set(rest.flatMap((other) => other.wires))].sort((x, y) => x - y);
    if (rest.length > 1 && isWorthJoining(rest, all)) {
      const found = await fitTogether(rest, all, b, options);
      if (found) {
        keep(found, all, b);
        break;
      }
    }
    const heir = needs[b]!.shared.length === 1 ? heirOf(blocks, b) : undefined;
    const isFitted = wires.length > 1 && wires.length <= FIT_WIRES_MAX;
    const found = isFitted ? await fitOneBlock(matrix, needs[b]!, heir, b, options) : null;
    if (!found) operations.push(unitaryGate(matrix, wires, 'block'));
    else {
      keep(found, wires, b);
      const made = templateUnitary(found.template, found.angles);
      if (heir) handOn(block, made, needs[b]!, heir);
    }
  }
  return { operations, fits };
}

export type FittedBlock = { operations: GateOperation[]; fit: FitRow };

function placeFit(found: Found, wires: readonly number[], block: number): FittedBlock {
  const local = templateOperations(found.template, found.angles);
  const { entanglers, iterations, distance, status } = found;
  return {
    operations: onWires(local, wires),
    fit: { block, wires: [...wires], entanglers, iterations, distance, status },
  };
}

/** One block on its own, exactly; null when no fit reached it. */
export async function fitBlockAlone(
  block: ChainBlock,
  index: number,
  options: FitChainOptions,
): Promise<FittedBlock | null> {
  const need = blockNeeds([block])[0]!;
  const found = await fitOneBlock(block.matrix, need, undefined, index, options);
  return found ? placeFit(found, block.wires, index) : null;
}

/** Blocks of two wires gain nothing together; larger ones do, as long as a joint fit is quick. */
function isWorthJoining(blocks: readonly ChainBlock[], all: readonly number[]): boolean {
  const largest = Math.max(...blocks.map(({ wires }) => wires.length));
  return largest > 2 && all.length <= JOINT_WIRES_MAX && blocks.length <= JOINT_BLOCKS_MAX;
}

/** Several blocks at once, over all their carriers. */
function fitTogether(
  blocks: readonly ChainBlock[],
  all: readonly number[],
  index: number,
  { entangler, seed, goal, runJobs, control = freeRunning }: FitChainOptions,
): Promise<Found | null> {
  const local = blocks.map(({ wires, matrix }) => ({
    wires: wires.map((wire) => all.indexOf(wire)),
    matrix,
  }));
  const needs = blockNeeds(local.filter(({ wires }) => wires.length > 1));
  return fewestEntanglers({
    label: index === 0 ? 'all blocks' : `all blocks from ${index + 1} on`,
    target: { kind: 'unitary', matrix: blocksUnitary(local, all.length) },
    bound: entanglersNeeded(needs, anglesOf(entangler)),
    templates: (count, attempts) =>
      chainTemplates(all.length, needs, count, { attempts, seed, entangler }),
    attempts: 4,
    seed,
    goal,
    runJobs,
    control,
  });
}

/** One block, exactly, or up to a unitary on the carriers it hands on to its heir. */
function fitOneBlock(
  matrix: Float64Array,
  need: BlockNeed,
  heir: ChainBlock | undefined,
  index: number,
  { entangler, seed, goal, runJobs, control = freeRunning }: FitChainOptions,
): Promise<Found | null> {
  const { wires, last, fresh, dimension } = need;
  const k = wires.length;
  const local = (list: readonly number[]): number[] => list.map((wire) => wires.indexOf(wire));
  const everything = wires.map((_, place) => place);
  const localNeed: BlockNeed = heir
    ? { wires: everything, dimension, shared: need.shared, fresh: local(fresh), last: local(last) }
    : {
        wires: everything,
        dimension: 4 ** k - 1,
        shared: [],
        fresh: local(fresh),
        last: everything,
      };
  const target: FitTarget = heir
    ? { kind: 'carry', pulled: pulledPaulis(matrix, k, local(last)) }
    : { kind: 'unitary', matrix };
  return fewestEntanglers({
    label: `block ${index + 1}`,
    target,
    bound: entanglersOfBlock(localNeed, anglesOf(entangler)),
    templates: (count, attempts) =>
      chainTemplates(k, [localNeed], count, { attempts, seed, entangler }),
    attempts: k === 2 ? 2 : 5,
    seed,
    goal,
    runJobs,
    control,
  });
}

function heirOf(blocks: readonly ChainBlock[], b: number): ChainBlock | undefined {
  const { wires } = blocks[b]!;
  return blocks.find((other, k) => k > b && other.wires.some((wire) => wires.includes(wire)));
}

/** A^dag P A for P = X, Z on each of the wires. */
function pulledPaulis(
  a: Float64Array,
  k: number,
  wires: readonly number[],
): { matrix: Float64Array; pauli: 'X' | 'Z'; wire: number }[] {
  const d = 2 ** k;
  return wires.flatMap((wire) =>
    (['X', 'Z'] as const).map((pauli) => {
      const turned = a.slice();
      applyGateInto(turned, gate(pauli.toLowerCase(), [wire]), k, d);
      return { matrix: mul(adjoint(a, d), turned, d), pauli, wire };
    }),
  );
}

/** The block is (1 x G) V with V what was fitted; G joins the next block, on its right. */
function handOn(
  { wires, matrix }: ChainBlock,
  made: Float64Array,
  { last }: BlockNeed,
  heir: ChainBlock,
): void {
  const k = wires.length;
  const d = 2 ** k;
  const ratio = mul(matrix, adjoint(made, d), d);
  const places = last.map((wire) => wires.indexOf(wire));
  const shared = wires.filter((wire) => !last.includes(wire));
  const g = nearestUnitary(averageOver(ratio, k, places), 2 ** shared.length);
  heir.matrix = mul(heir.matrix, widen(g, shared, heir.wires), 2 ** heir.wires.length);
}

/** How many free angles one more entangler brings. */
function anglesOf(entangler: Entangler): number {
  const pair: readonly [number, number] = [0, 1];
  return angleCount(entanglerTemplate(2, [pair], entangler)) - 6;
}
