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
import type { Chain, ChainBlock } from './chain.ts';
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

/** The fewest entanglers with `anglesEach` free angles each that a generic chain can need. */
export function entanglersNeeded(needs: readonly BlockNeed[], anglesEach = 4): number {
  const wires = new Set(needs.flatMap((need) => need.wires)).size;
  const links = needs.reduce((sum, need) => sum + need.wires.length - 1, 0);
  const byDimension = Math.ceil((chainDimension(needs) - 3 * wires) / Math.max(1, anglesEach));
  return Math.max(byDimension, links > 0 ? 1 : 0);
}

/** Ways to share `count` entanglers over the blocks: in proportion first, then with one moved to a neighbour. */
export function shareOut(needs: readonly BlockNeed[], count: number): number[][] {
  const weights = needs.map(({ wires, shared, dimension }) => {
    const rotations = 3 * wires.length - 3 * shared.reduce((sum, s) => sum + s, 0);
    return Math.max(0.1, (dimension - rotations) / 4);
  });
  const total = weights.reduce((sum, w) => sum + w, 0);
  const ideal = weights.map((w) => (w * count) / total);
  const base = ideal.map(Math.floor);
  const rest = count - base.reduce((sum, x) => sum + x, 0);
  const byRest = ideal
    .map((x, b) => ({ b, part: x - Math.floor(x) }))
    .sort((x, y) => y.part - x.part || y.b - x.b);
  for (let k = 0; k < rest; k++) base[byRest[k % byRest.length]!.b]!++;
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

/** Templates over all carriers with `count` entanglers, best guesses first; `attempts` orders per share. */
export function chainTemplates(
  chain: Chain,
  blocks: readonly ChainBlock[],
  count: number,
  { attempts, seed, entangler }: { attempts: number; seed: number; entangler: Entangler },
): ChainTemplate[] {
  const needs = blockNeeds(blocks);
  const shares = shareOut(needs, count);
  const templates: ChainTemplate[] = [];
  for (let attempt = 0; attempt < attempts; attempt++) {
    for (const share of shares) {
      const pairs = needs.flatMap((need, b) => {
        const draw = attempt === 0 ? null : random(seed, 'pairs', count, attempt, b);
        return placePairs(need, share[b]!, draw);
      });
      templates.push({ template: entanglerTemplate(chain.wires, pairs, entangler), pairs, share });
    }
  }
  return templates;
}
