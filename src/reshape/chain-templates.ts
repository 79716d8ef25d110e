/**
 * Chooses how many entanglers the blocks of a chain get, and on which pairs, before they are fitted.
 *
 * Convention: pairs are pairs of carriers; a template puts them in the order of the blocks, so that no gate
 * needs a carrier that has not entered or has left.
 * Method: dimension counting (Shende, Markov, Bullock, PRA 69, 062321 (2004), proposition III.1, extended to
 * chains). A block on k carriers has 4^k - 1 real dimensions; what it hands on to a later block on s shared
 * carriers is free there, 4^s - 1. A circuit with c CX on n wires has 4c + 3n angles, so a generic chain needs
 * c >= (dimension - 3n) / 4. The need is shared out over the blocks in proportion, and rounding is tried both ways.
 * Placement: pairs go round in cycles; the last pair of a block touches a carrier that leaves, and the first
 * pair of a later block one that the block before did not have: other gates there would only repeat.
 */
import { type Random, random } from '../numeric/random.ts';
import type { ChainBlock } from './chain.ts';
import { type Entangler, entanglerTemplate, type Template } from './template.ts';

export type Pair = readonly [number, number];

export type BlockNeed = {
  wires: readonly number[];
  /** Dimension of the block less what it hands on. */
  dimension: number;
  /** Sizes of the groups of carriers that go on to one later block each. */
  shared: readonly number[];
  /** Carriers that no earlier block touched, and that no later block touches. */
  fresh: readonly number[];
  last: readonly number[];
};

/** What each block of the list (those on two carriers or more) asks of the template. */
export function blockNeeds(blocks: readonly ChainBlock[]): BlockNeed[] {
  return blocks.map(({ wires }, b) => {
    const before = new Set(blocks.slice(0, b).flatMap((other) => other.wires));
    const nextOf = (wire: number): number =>
      blocks.findIndex((other, index) => index > b && other.wires.includes(wire));
    const groups = new Map<number, number>();
    for (const wire of wires) {
      const next = nextOf(wire);
      if (next >= 0) groups.set(next, (groups.get(next) ?? 0) + 1);
    }
    const shared = [...groups.values()];
    return {
      wires,
      dimension: 4 ** wires.length - 1 - shared.reduce((sum, s) => sum + 4 ** s - 1, 0),
      shared,
      fresh: wires.filter((wire) => !before.has(wire)),
      last: wires.filter((wire) => nextOf(wire) < 0),
    };
  });
}

/** The dimension of a generic chain with blocks like these. */
export function chainDimension(needs: readonly BlockNeed[]): number {
  return needs.reduce((sum, { dimension }) => sum + dimension, 0);
}

/**
 * How many entanglers a generic chain takes, with `anglesEach` free angles for each: the dimension bound, or
 * more where blocks on two wires need three each for their class (Shende, Bullock, Markov, PRA 70, 012310
 * (2004)), which no freedom between blocks changes.
 */
export function entanglersNeeded(needs: readonly BlockNeed[], anglesEach = 4): number {
  const wires = new Set(needs.flatMap((need) => need.wires)).size;
  const byDimension = Math.ceil((chainDimension(needs) - 3 * wires) / Math.max(1, anglesEach));
  const byBlock = needs.reduce((sum, need) => sum + entanglersOfBlock(need, anglesEach), 0);
  return Math.max(byDimension, needs.every(({ wires: w }) => w.length === 2) ? byBlock : 0);
}

/** The same for one block whose freedom is handed on. */
export function entanglersOfBlock(need: BlockNeed, anglesEach = 4): number {
  if (need.wires.length === 2 && anglesEach === 4) return 3;
  return Math.max(1, Math.ceil(dimensionLeft(need) / Math.max(1, anglesEach)));
}

/** Dimension of a block less its rotations that the target can see. */
function dimensionLeft({ wires, shared, dimension }: BlockNeed): number {
  const handedOn = shared.reduce((sum, s) => sum + s, 0);
  return Math.max(0, dimension - 3 * wires.length + 3 * handedOn);
}

/**
 * Ways to share `count` entanglers over the blocks, best guess first: each block but the last gets its need
 * rounded up and the last the rest, when that is the bound; otherwise in proportion. Then one entangler is
 * moved to a neighbour.
 */
export function shareOut(needs: readonly BlockNeed[], count: number): number[][] {
  const weights = needs.map((need) =>
    need.wires.length === 2 ? 3 : Math.max(0.1, dimensionLeft(need) / 4),
  );
  const total = weights.reduce((sum, w) => sum + w, 0);
  const scale = Math.min(1, count / total);
  const base: number[] = [];
  let left = count;
  for (const [b, weight] of weights.entries()) {
    const isLast = b === weights.length - 1;
    const share = isLast ? left : Math.min(left, Math.ceil(weight * scale - 1e-9));
    base.push(share);
    left -= share;
  }
  const found = new Map<string, number[]>([[base.join(), base]]);
  for (let b = 0; b + 1 < base.length; b++) {
    for (const step of [1, -1]) {
      const moved = [...base];
      moved[b]! += step;
      moved[b + 1]! -= step;
      if (Math.min(...moved) >= 0) found.set(moved.join(), moved);
    }
  }
  return [...found.values()];
}

/** Pairs for one block; attempt 0 goes round in order, later attempts in orders drawn from the seed. */
export function placePairs(need: BlockNeed, count: number, draw: Random | null): Pair[] {
  const { wires, fresh, last } = need;
  const cycle = pairCycle(wires);
  if (cycle.length === 1) return new Array<Pair>(count).fill(cycle[0]!);
  const touches = (pair: Pair, set: readonly number[]): boolean =>
    set.length === 0 || set.includes(pair[0]) || set.includes(pair[1]);
  const from = draw ? Math.floor(draw() * cycle.length) : 0;
  let best: Pair[] = [];
  let bestScore = -1;
  for (let shift = 0; shift < cycle.length; shift++) {
    const pairs = Array.from(
      { length: count },
      (_, k) => cycle[(k + shift + from) % cycle.length]!,
    );
    const first = pairs[0];
    const end = pairs.at(-1);
    const score = (first && touches(first, fresh) ? 1 : 0) + (end && touches(end, last) ? 2 : 0);
    if (score > bestScore) [best, bestScore] = [pairs, score];
  }
  return best;
}

/** All pairs of the wires, neighbours in the cycle sharing a wire where there are three. */
function pairCycle(wires: readonly number[]): Pair[] {
  const pairs: Pair[] = [];
  // by distance: (0,1) (1,2) (2,3) .. then (0,2) (1,3) ..: wires take turns
  for (let gap = 1; gap < wires.length; gap++) {
    for (let a = 0; a + gap < wires.length; a++) pairs.push([wires[a]!, wires[a + gap]!]);
  }
  return pairs;
}

export type ChainTemplate = {
  template: Template;
  pairs: readonly Pair[];
  share: readonly number[];
};

/**
 * Templates over all carriers with `count` entanglers, best guesses first. The best guess stands there several
 * times, for several starts; then come other shares, then other orders of the pairs. (Measured on generic
 * chains of two 3-wire blocks: 12 + 13 entanglers in plain cycles, 6 of 6 from the first start; 13 + 12, 2 of 6.)
 */
export function chainTemplates(
  wires: number,
  needs: readonly BlockNeed[],
  count: number,
  { attempts, seed, entangler }: { attempts: number; seed: number; entangler: Entangler },
): Template[] {
  const shares = shareOut(needs, count);
  const make = (share: readonly number[], order: number): Template => {
    const pairs = needs.flatMap((need, b) => {
      const draw = order === 0 ? null : random(seed, 'pairs', count, order, b);
      return placePairs(need, share[b]!, draw);
    });
    return entanglerTemplate(wires, pairs, entangler);
  };
  const first = make(shares[0]!, 0);
  const templates = new Array<Template>(attempts).fill(first);
  if (attempts < 2) return templates;
  for (const share of shares.slice(1, 3)) templates.push(make(share, 0));
  for (let order = 1; order < attempts; order++) templates.push(make(shares[0]!, order));
  return templates;
}
