/**
 * Fits the angles of a template to a target: the job that workers run.
 *
 * Starts: uniform in (-pi, pi] from `random(seed, id)`, or the angles given plus a normal perturbation.
 * Result: the best angles found and D there; `status` says why the search stopped. Same job, same bytes, wherever it
 * runs; a stop from outside returns the best so far with status `aborted`.
 */
import { type Control, freeRunning } from '../control.ts';
import type { Job } from '../jobs.ts';
import { normal, random } from '../numeric/random.ts';
import { bfgs } from '../optimise/bfgs.ts';
import { lBfgs } from '../optimise/l-bfgs.ts';
import {
  type LevenbergMarquardtOptions,
  levenbergMarquardt,
} from '../optimise/levenberg-marquardt.ts';
import { nelderMead } from '../optimise/nelder-mead.ts';
import type { OptimiserResult, Status } from '../optimise/result.ts';
import { FitObjective, type FitTarget } from './objective.ts';
import type { Template } from './template.ts';

export type { FitTarget } from './objective.ts';

export type FitJob = Job & {
  kind: 'fit';
  template: Template;
  target: FitTarget;
  /** Angles to start from; random ones without. */
  start?: Float64Array;
  /** Standard deviation added to `start`, in radians; default 0. */
  perturbation?: number;
  optimiser: 'lm' | 'bfgs' | 'lbfgs' | 'nelder-mead';
  /** 1 = this angle keeps its starting value. */
  frozen?: Uint8Array;
  /** Stop once D is at most this. */
  goal: number;
  iterationsMax: number;
  /** For `lm`: give up when D falls too little over this many iterations; its own default without. */
  stallIterations?: number;
};

export type FitResult = {
  id: string;
  angles: Float64Array;
  distance: number;
  status: Status;
  iterations: number;
  evaluations: number;
};

/** D of a fit that is exact up to rounding. */
const DISTANCE_FLOOR = 1e-30;

/** Iterations between two pauses. */
const PAUSE_EVERY = 4;

export async function fitBlock(job: FitJob, control: Control = freeRunning): Promise<FitResult> {
  const objective = new FitObjective(job.template, job.target, job.frozen);
  const start = startingAngles(job, objective.size);
  const run = minimise(job, objective, start, {
    goal: objective.valueOf(job.goal),
    floor: objective.valueOf(DISTANCE_FLOOR),
    iterationsMax: job.iterationsMax,
    ...(job.stallIterations === undefined ? {} : { stallIterations: job.stallIterations }),
    control,
    onIteration: (iteration: number, value: number) => {
      const distance = objective.distance(value);
      control.report({ stage: 'fitting', job: job.id, iteration, distance });
    },
  });
  let turn = run.next();
  for (let k = 1; !turn.done; k++) {
    if (k % PAUSE_EVERY === 0) await control.pause();
    turn = run.next();
  }
  return resultOf(job, objective, turn.value);
}

/** The optimiser that the job asks for; all four take the same options and yield once an iteration. */
function minimise(
  { optimiser, frozen }: FitJob,
  objective: FitObjective,
  start: Float64Array,
  options: LevenbergMarquardtOptions,
): Generator<void, OptimiserResult> {
  switch (optimiser) {
    case 'lm':
      return levenbergMarquardt(objective, start, options);
    case 'bfgs':
      return bfgs(objective, start, options);
    case 'lbfgs':
      return lBfgs(objective, start, options);
    case 'nelder-mead':
      return withoutFrozen(objective, start, frozen, options);
  }
}

/** Nelder-Mead knows no gradient that frozen angles could drop out of, so it gets the open ones only. */
function* withoutFrozen(
  objective: FitObjective,
  start: Float64Array,
  frozen: Uint8Array | undefined,
  options: LevenbergMarquardtOptions,
): Generator<void, OptimiserResult> {
  const open = [...start.keys()].filter((k) => !frozen?.[k]);
  const all = start.slice();
  const fill = (x: Float64Array): Float64Array => {
    for (const [k, index] of open.entries()) all[index] = x[k]!;
    return all;
  };
  const problem = {
    size: open.length,
    value: (x: Float64Array): number => objective.value(fill(x)),
  };
  const openStart = Float64Array.from(open, (index) => start[index]!);
  const found = yield* nelderMead(problem, openStart, options);
  return { ...found, x: fill(found.x).slice() };
}

function resultOf(job: FitJob, objective: FitObjective, found: OptimiserResult): FitResult {
  const { x, value, status, iterations, evaluations } = found;
  const angles = x.map((angle) => angle - 2 * Math.PI * Math.round(angle / (2 * Math.PI)));
  return {
    id: job.id,
    angles,
    distance: objective.distance(value),
    status,
    iterations,
    evaluations,
  };
}

function startingAngles({ id, seed, start, perturbation = 0 }: FitJob, size: number): Float64Array {
  const draw = random(seed, id);
  if (!start) return Float64Array.from({ length: size }, () => Math.PI * (2 * draw() - 1));
  if (perturbation === 0) return start.slice();
  return start.map((angle) => angle + perturbation * normal(draw));
}
