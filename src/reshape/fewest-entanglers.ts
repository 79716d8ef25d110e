/**
 * Looks for the fewest entanglers with which a fit reaches its target, without trying every number.
 *
 * Method: a generic target needs its dimension bound and no fewer can do; a target with structure often needs
 * far fewer. A probe at half the bound tells them apart: it stays far off for a generic target. Then either the
 * bound (and a few more) is tried, or the number is bisected, taking for granted that more entanglers never hurt.
 * Result: the smallest number that was seen to work; null when none of those tried did.
 */
import type { Control } from '../control.ts';
import type { RunJobs } from '../jobs.ts';
import type { FitJob, FitResult, FitTarget } from './fit-block.ts';
import type { Template } from './template.ts';

/** A probe that ends above this D is taken for a generic target. */
const GENERIC_DISTANCE = 0.02;
/** Up to this bound every number is tried, from zero. */
const TRY_ALL_MAX = 4;
/** Above this bound a fit gets two starts a number at most. */
const LARGE_BOUND = 30;
const PROBE_ITERATIONS = 30;
const ITERATIONS_MAX = 400;
/** How many more than the bound are tried before giving up. */
const SPARE = [0, 1, 2, 4];

export type Found = FitResult & { template: Template; entanglers: number };

export type Search = {
  /** Names the jobs; unique within one narrowing. */
  label: string;
  target: FitTarget;
  bound: number;
  /** Templates with that many entanglers, best guesses first. */
  templates(count: number, attempts: number): readonly Template[];
  attempts: number;
  seed: number;
  /** A fit counts as done at this D. */
  goal: number;
  runJobs: RunJobs;
  control: Control;
};

export async function fewestEntanglers(given: Search): Promise<Found | null> {
  const { bound, goal, control } = given;
  // a large fit is slow, and one spare entangler helps it more than another start
  const search = bound > LARGE_BOUND ? { ...given, attempts: Math.min(2, given.attempts) } : given;
  const works = (found: Found | null): found is Found => found !== null && found.distance <= goal;
  if (bound <= TRY_ALL_MAX) {
    for (let count = 0; count <= bound + 2 && !control.stopped(); count++) {
      const found = await bestFit(search, count, search.attempts, ITERATIONS_MAX);
      if (works(found)) return found;
    }
    return null;
  }
  const half = Math.ceil(bound / 2);
  const probe = await bestFit(search, half, 1, PROBE_ITERATIONS);
  let best: Found | null = works(probe) ? probe : null;
  const isGeneric = !best && (probe === null || probe.distance > GENERIC_DISTANCE);
  if (!isGeneric) {
    // between `fails` and `holds`, bisected; the bound itself is tried when nothing below it holds
    let fails = best ? -1 : half;
    let holds = best ? half : bound;
    while (holds - fails > 1 && !control.stopped()) {
      const middle = Math.floor((fails + holds) / 2);
      const found = await bestFit(search, middle, search.attempts, ITERATIONS_MAX);
      if (works(found)) [best, holds] = [found, middle];
      else fails = middle;
    }
    if (best) return best;
  }
  for (const spare of SPARE) {
    if (control.stopped()) return null;
    const found = await bestFit(search, bound + spare, search.attempts, ITERATIONS_MAX);
    if (works(found)) return found;
  }
  return null;
}

/** The first fit in list order that reaches the goal, or else the nearest; null when there is no template. */
async function bestFit(
  search: Search,
  count: number,
  attempts: number,
  iterationsMax: number,
): Promise<Found | null> {
  const { label, target, seed, goal, runJobs, control } = search;
  const templates = search.templates(count, attempts);
  control.report({ stage: `fitting ${label} with ${count} entanglers` });
  const jobs = templates.map(
    (template, k): FitJob => ({
      kind: 'fit',
      id: `${label}/${count}/${k}`,
      seed,
      template,
      target,
      optimiser: 'lm',
      goal: goal * 1e-12,
      iterationsMax,
    }),
  );
  const enough = (result: FitResult): boolean => result.distance <= goal;
  const results = await runJobs<FitJob, FitResult>(jobs, { control, enough });
  let best: Found | null = null;
  results.forEach((result, k) => {
    if (!result || (best && !(result.distance < best.distance))) return;
    best = { ...result, template: templates[k]!, entanglers: count };
  });
  return best;
}
