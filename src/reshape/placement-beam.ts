/**
 * Searches for the fewest entanglers of a target with structure, by extending placements one pair at a time.
 *
 * Method: a beam. Each level fits every extension of the placements kept, from the angles of the shorter one and once
 * from a random start, and keeps those that came nearest. Placements that differ only in the order of pairs without a common
 * wire count as one, and more than three in a row on one pair are left out (a two-wire gate needs no more than three CX).
 * Batches are decided in list order, so the answer does not depend on the number of workers.
 * Result: the first placement that reaches the tolerance, or null at `countMax`, when the search stays too far off
 * (`farAt`), or when stopped; `levels` holds the nearest of every count; `isExhausted` says that nothing was cut away.
 */
import type { Control } from '../control.ts';
import type { RunJobs } from '../jobs.ts';
import type { FitJob, FitResult, FitTarget } from './fit-block.ts';
import { mirrored, type Symmetry, symmetriesOf } from './placement-symmetry.ts';
import { angleCount, type Template } from './template.ts';

export type Pair = readonly [number, number];

export type Placement = {
  pairs: readonly Pair[];
  angles: Float64Array;
  distance: number;
  iterations: number;
  status: string;
};

export type FitSettings = {
  /** Names the jobs; unique in one command. */
  label: string;
  target: FitTarget;
  templateOf(pairs: readonly Pair[]): Template;
  tolerance: number;
  seed: number;
  optimiser: FitJob['optimiser'];
  runJobs: RunJobs;
  control: Control;
  /** As in `FitJob`. */
  stallIterations?: number;
};

export type BeamSettings = FitSettings & {
  links: readonly Pair[];
  countMax: number;
  /** Gives up when the nearest placement with `count` pairs is farther than this. */
  farAt?: (count: number) => number;
};

const BEAM = 12;
/** Symmetries are looked for on at most this many wires. */
const SYMMETRY_WIRES_MAX = 3;
const ITERATIONS_MAX = 400;
/** Standard deviation that breaks the symmetry of a warm start, in radians. */
const PERTURBATION = 0.3;
/** D of a fit that counts as exact: far below any tolerance, above rounding. */
const GOAL = 1e-24;

/**
 * What targets with structure come within at this many entanglers on three wires: 0.08 and less from five on for named
 * gates, where random unitaries stay above 0.12 (measured; a target in between costs time, not correctness).
 */
export function structuredDistance(count: number): number {
  return count < 5 ? 1 : 0.1;
}

export type BeamResult = { best: Placement | null; levels: Placement[]; isExhausted: boolean };

export async function beamOfPlacements(settings: BeamSettings): Promise<BeamResult> {
  const { links, countMax, farAt, tolerance, control, label } = settings;
  const levels: Placement[] = [];
  let isExhausted = true;
  let kept = await fitPlacements([{ pairs: [], start: null }], settings);
  for (let count = 0; ; count++) {
    const [nearest] = kept;
    if (nearest) levels.push(nearest);
    if (nearest && nearest.distance <= tolerance) return { best: nearest, levels, isExhausted };
    const isFar = nearest !== undefined && farAt !== undefined && nearest.distance > farAt(count);
    if (count >= countMax || isFar || control.stopped()) return { best: null, levels, isExhausted };
    control.report({ stage: `placing ${count + 1} entanglers for ${label}` });
    const beam = distinct(kept);
    if (beam.length > BEAM) isExhausted = false;
    const longer = extensions(beam.slice(0, BEAM), links);
    const fresh = longer.map(({ pairs }) => ({ pairs, start: null }));
    kept = await fitPlacements([...longer, ...fresh], settings);
  }
}

/** The most fits that one count may take when every placement is tried. */
const EXHAUSTIVE_FITS_MAX = 4400;
/** Random starts for each placement then: at least, and at most. */
const EXHAUSTIVE_STARTS_MIN = 2;
const EXHAUSTIVE_STARTS_MAX = 6;
/** Most of these fits lead nowhere: one that gains less than 5 % in this many iterations is given up. */
const EXHAUSTIVE_STALL_ITERATIONS = 20;

/** Moves are tried in placements with at most this many entanglers, and at most so many. */
const MOVES_COUNT_MAX = 14;
const MOVES_MAX = 600;

export type Descent = {
  best: Placement;
  /** Every placement of fewer was tried, up to the symmetries of the target. */
  isExhausted: boolean;
  /** With at least this many random starts each. */
  starts: number;
};

/**
 * Tries every placement with one entangler less, again and again until none works. Two counts that fail in a row cover
 * all smaller ones: two equal entanglers in a row can undo each other, so m placed ones can do whatever m - 2 can.
 */
export async function descend(found: Placement, settings: BeamSettings): Promise<Descent> {
  const { links, tolerance, control, target, templateOf } = settings;
  let best = found;
  let failed = 0;
  let isComplete = true;
  let startsLeast = EXHAUSTIVE_STARTS_MAX;
  const { wires } = templateOf([]);
  const isSmall = target.kind === 'unitary' && wires <= SYMMETRY_WIRES_MAX;
  const symmetries = isSmall ? symmetriesOf(target.matrix, wires, links) : [];
  for (let count = found.pairs.length - 1; count >= 0 && failed < 2; count--) {
    const most = EXHAUSTIVE_FITS_MAX / EXHAUSTIVE_STARTS_MIN;
    const placements = allPlacements(count, links, most, symmetries);
    if (!placements || control.stopped()) {
      isComplete = false;
      break;
    }
    control.report({ stage: `trying every placement of ${count} entanglers` });
    const starts = Math.min(
      EXHAUSTIVE_STARTS_MAX,
      Math.floor(EXHAUSTIVE_FITS_MAX / Math.max(1, placements.length)),
    );
    // all placements once, then all once more: an easy one ends it early
    const list = Array.from({ length: starts }, () =>
      placements.map((pairs) => ({ pairs, start: null })),
    ).flat();
    const label = `${settings.label}, every placement`;
    const stallIterations = EXHAUSTIVE_STALL_ITERATIONS;
    const [nearest] = await fitPlacements(list, { ...settings, label, stallIterations });
    if (nearest && nearest.distance <= tolerance) {
      best = nearest;
      failed = 0;
      startsLeast = EXHAUSTIVE_STARTS_MAX;
    } else {
      failed++;
      startsLeast = Math.min(startsLeast, starts);
    }
  }
  return { best, isExhausted: isComplete && !control.stopped(), starts: startsLeast };
}

/**
 * Takes entanglers out one by one, as long as the rest can still be fitted: from the angles that are left, and from a random
 * start. More entanglers than needed make fits easy (Larocca et al., arXiv:2109.11676), so this goes down from a placement
 * that is known to do. Where none can simply go, placements with one out and another one moved to a different link or
 * place are tried, up to `MOVES_MAX` of them.
 */
export async function shorten(
  found: Placement,
  settings: FitSettings & { links?: readonly Pair[]; from?: number },
): Promise<Placement> {
  const { tolerance, control, label, links } = settings;
  let best = found;
  // removals go round the circuit, so that one place is not tried again and again
  let from = settings.from ?? 0;
  while (best.pairs.length > 0 && !control.stopped()) {
    const count = best.pairs.length;
    control.report({ stage: `taking one of ${count} entanglers out of ${label}` });
    const list = removals(best, from, settings);
    const [nearest] = await fitPlacements(list, { ...settings, label: `${label}, shorter` });
    if (nearest && nearest.distance <= tolerance) {
      const removed = list.findIndex(({ pairs: shorter }) => shorter === nearest.pairs);
      from = Math.floor(removed / 2) + from;
      best = nearest;
      continue;
    }
    if (!links || count > MOVES_COUNT_MAX) break;
    control.report({ stage: `moving one of ${count} entanglers of ${label}` });
    const moves = moved(best.pairs, links).map((pairs) => ({ pairs, start: null }));
    const stallIterations = EXHAUSTIVE_STALL_ITERATIONS;
    const [other] = await fitPlacements(moves, { ...settings, label: `${label}, moved`, stallIterations }); // biome-ignore format: one call
    if (!other || other.distance > tolerance) break;
    best = other;
    from = 0;
  }
  return best;
}

/** One out, from the angles that are left and from a random start, beginning with pair `from`. */
function removals(
  { pairs, angles }: Placement,
  from: number,
  { templateOf }: FitSettings,
): { pairs: readonly Pair[]; start: Float64Array | null }[] {
  const count = pairs.length;
  return Array.from({ length: count }, (_, k) => (from + k) % count).flatMap((k) => {
    const shorter = [...pairs.slice(0, k), ...pairs.slice(k + 1)];
    const size = (list: readonly Pair[]): number => angleCount(templateOf(list));
    const [start, end] = [size(pairs.slice(0, k)), size(pairs.slice(0, k + 1))];
    const left = Float64Array.from([...angles.subarray(0, start), ...angles.subarray(end)]);
    return [
      { pairs: shorter, start: left },
      { pairs: shorter, start: null },
    ];
  });
}

/** One out and another one on a different link or elsewhere; one of each key, evenly thinned out to `MOVES_MAX`. */
function moved(pairs: readonly Pair[], links: readonly Pair[]): (readonly Pair[])[] {
  const seen = new Map<string, readonly Pair[]>();
  for (let out = 0; out < pairs.length; out++) {
    const shorter = [...pairs.slice(0, out), ...pairs.slice(out + 1)];
    seen.set(placementKey(shorter), shorter);
  }
  const plain = seen.size;
  for (const shorter of [...seen.values()]) {
    for (let k = 0; k < shorter.length; k++) {
      const rest = [...shorter.slice(0, k), ...shorter.slice(k + 1)];
      for (let place = 0; place <= rest.length; place++) {
        for (const link of links) {
          const other = [...rest.slice(0, place), link, ...rest.slice(place)];
          const key = placementKey(other);
          if (!seen.has(key) && !isWasteful(other)) seen.set(key, other);
        }
      }
    }
  }
  const list = [...seen.values()].slice(plain);
  const step = Math.max(1, list.length / MOVES_MAX);
  return Array.from({ length: Math.min(list.length, MOVES_MAX) }, (_, k) => list[Math.floor(k * step)]!); // biome-ignore format: one list
}

/**
 * All placements of this many pairs that are not wasteful, one of each key and one of those that a symmetry makes alike; undefined
 * when there are more than `most`.
 */
function allPlacements(
  count: number,
  links: readonly Pair[],
  most: number,
  symmetries: readonly Symmetry[],
): (readonly Pair[])[] | undefined {
  let list: (readonly Pair[])[] = [[]];
  for (let k = 0; k < count; k++) {
    const seen = new Map<string, readonly Pair[]>();
    for (const pairs of list) {
      for (const link of links) {
        const longer = [...pairs, link];
        const key = placementKey(longer);
        if (!isWasteful(longer) && !seen.has(key)) seen.set(key, longer);
      }
      if (seen.size > most * (1 + symmetries.length)) return undefined;
    }
    list = [...seen.values()];
  }
  const first = list.filter((pairs) => {
    const key = placementKey(pairs);
    return symmetries.every((symmetry) => placementKey(mirrored(pairs, symmetry)) >= key);
  });
  return first.length > most ? undefined : first;
}

/** Fits placements, from the angles given or from random starts; nearest first, ties in list order. */
export async function fitPlacements(
  list: readonly { pairs: readonly Pair[]; start: Float64Array | null; isExact?: boolean }[],
  settings: FitSettings,
): Promise<Placement[]> {
  const { label, target, templateOf, tolerance, seed, optimiser, runJobs, control } = settings;
  const { stallIterations } = settings;
  const jobs = list.map(({ pairs, start, isExact }, k): FitJob => {
    const template = templateOf(pairs);
    const warm = start && extended(start, angleCount(template));
    return {
      kind: 'fit',
      id: `${label}/${pairs.length} entanglers/${k}`,
      seed,
      template,
      target,
      ...(warm ? { start: warm, perturbation: isExact ? 0 : PERTURBATION } : {}),
      optimiser,
      goal: GOAL,
      iterationsMax: ITERATIONS_MAX,
      ...(stallIterations === undefined ? {} : { stallIterations }),
    };
  });
  const enough = (result: FitResult): boolean => result.distance <= tolerance;
  const results = await runJobs<FitJob, FitResult>(jobs, { control, enough });
  const found: Placement[] = [];
  results.forEach((result, k) => {
    if (!result || !Number.isFinite(result.distance)) return;
    const { angles, distance, iterations, status } = result;
    found.push({ pairs: list[k]!.pairs, angles, distance, iterations, status });
  });
  return found.sort((a, b) => a.distance - b.distance);
}

/** The nearest placement of each key, nearest first. */
function distinct(placements: readonly Placement[]): Placement[] {
  const found = new Map<string, Placement>();
  for (const placement of placements) {
    const key = placementKey(placement.pairs);
    if (!found.has(key)) found.set(key, placement);
  }
  return [...found.values()];
}

function extensions(
  beam: readonly Placement[],
  links: readonly Pair[],
): { pairs: readonly Pair[]; start: Float64Array | null }[] {
  const seen = new Set<string>();
  const out: { pairs: readonly Pair[]; start: Float64Array | null }[] = [];
  for (const { pairs, angles } of beam) {
    for (const link of links) {
      const longer = [...pairs, link];
      const key = placementKey(longer);
      if (seen.has(key) || isWasteful(longer)) continue;
      seen.add(key);
      out.push({ pairs: longer, start: angles });
    }
  }
  return out;
}

/** Angles for a longer template: those known, and zeros. */
function extended(start: Float64Array, size: number): Float64Array {
  const out = new Float64Array(size);
  out.set(start.subarray(0, size));
  return out;
}

function isWasteful(pairs: readonly Pair[]): boolean {
  const last = pairs.slice(-4);
  const [first] = last;
  return last.length === 4 && last.every(([a, b]) => a === first![0] && b === first![1]);
}

/** One key for all orders of pairs that have no wire in common. */
function placementKey(pairs: readonly Pair[]): string {
  const level = new Map<number, number>();
  const placed = pairs.map(([a, b]) => {
    const at = Math.max(level.get(a) ?? 0, level.get(b) ?? 0) + 1;
    level.set(a, at);
    level.set(b, at);
    return `${String(at).padStart(3, '0')}:${a}-${b}`;
  });
  return placed.sort().join(' ');
}
