/**
 * The loop that BFGS and L-BFGS share: direction, line search, update.
 *
 * Shape: x and the gradient g have `size` entries.
 * Method: Nocedal and Wright, Numerical Optimization, 2nd ed. (2006), algorithm 6.1; the line search is that of
 * line-search.ts. Pairs with too little curvature are not taken up.
 * Changed: where a direction does not descend or its line search fails, the memory is dropped and steepest descent
 * gets one try before the run counts as stalled.
 * Cost: one or two evaluations of value and gradient an iteration, besides that of the direction.
 * Fails: never; the status says why it stopped, and x is the best point seen.
 * Symbols: s = step, y = change of the gradient.
 */
import type { Control } from '../control.ts';
import { type LinePoint, strongWolfe } from './line-search.ts';
import type { OptimiserResult, Status } from './result.ts';

export type GradientProblem = {
  size: number;
  /** The objective at x; fills its gradient. */
  valueAndGradient(x: Float64Array, gradient: Float64Array): number;
};

export type DescentOptions = {
  /** Converged at a value at most this. Without a goal, a small gradient counts as converged. */
  goal?: number;
  iterationsMax: number;
  evaluationsMax?: number;
  /** Bound on the largest entry of the gradient, relative to max(1, |value|). */
  gradientTolerance?: number;
  /** With a goal: stalled when the value falls by less than this share over `stallIterations`. */
  stallShare?: number;
  stallIterations?: number;
  control: Control;
  onIteration?: (iteration: number, value: number, x: Float64Array) => void;
};

/** What makes a method: a direction from the gradient, and what it learns from a step. */
export type Direction = {
  /** out = -H g. */
  pointInto(out: Float64Array, gradient: Float64Array): void;
  learn(step: Float64Array, change: Float64Array): void;
  forget(): void;
};

const GRADIENT_TOLERANCE = 1e-8;
const STALL_SHARE = 0.05;
const STALL_ITERATIONS = 200;
const CURVATURE_MIN = 1e-12;

/** Runs until the goal, a stall, a limit or a stop; yields between iterations so that a caller may pause. */
export function* descend(
  problem: GradientProblem,
  start: Float64Array,
  method: Direction,
  options: DescentOptions,
): Generator<void, OptimiserResult> {
  const { control, iterationsMax, evaluationsMax = Number.POSITIVE_INFINITY } = options;
  const p = problem.size;
  const [x, trial, gradient, next] = [start.slice(), start.slice(), zeros(p), zeros(p)];
  const [direction, step, change] = [zeros(p), zeros(p), zeros(p)];
  let value = problem.valueAndGradient(x, gradient);
  let evaluations = 1;
  let iterations = 0;
  let isFresh = true;
  const history = [value];
  const at = (length: number): LinePoint => {
    for (let k = 0; k < p; k++) trial[k] = x[k]! + length * direction[k]!;
    evaluations++;
    const found = problem.valueAndGradient(trial, next);
    return { length, value: found, slope: dot(next, direction) };
  };
  const result = (status: Status): OptimiserResult => ({
    x,
    value,
    status,
    iterations,
    evaluations,
  });
  while (true) {
    const reason = whyStop(value, gradient, history, options);
    if (reason) return result(reason);
    if (iterations >= iterationsMax) return result('iteration-limit');
    if (evaluations >= evaluationsMax) return result('evaluation-limit');
    if (control.stopped()) return result('aborted');
    method.pointInto(direction, gradient);
    let slope = dot(gradient, direction);
    if (!(slope < 0)) {
      method.forget();
      isFresh = true;
      for (let k = 0; k < p; k++) direction[k] = -gradient[k]!;
      slope = dot(gradient, direction);
    }
    const first = isFresh ? Math.min(1, 1 / largest(gradient)) : 1;
    const found = strongWolfe(at, { length: 0, value, slope }, first);
    if (!found) {
      if (isFresh) return result('stalled');
      method.forget();
      isFresh = true;
      continue;
    }
    for (let k = 0; k < p; k++) {
      step[k] = trial[k]! - x[k]!;
      change[k] = next[k]! - gradient[k]!;
    }
    x.set(trial);
    gradient.set(next);
    value = found.value;
    history.push(value);
    iterations++;
    const curvature = dot(step, change);
    if (curvature > CURVATURE_MIN * Math.sqrt(dot(step, step) * dot(change, change))) {
      method.learn(step, change);
      isFresh = false;
    }
    options.onIteration?.(iterations, value, x);
    yield;
  }
}

function whyStop(
  value: number,
  gradient: Float64Array,
  history: readonly number[],
  options: DescentOptions,
): Status | undefined {
  const { goal, gradientTolerance = GRADIENT_TOLERANCE } = options;
  const top = largest(gradient);
  if (!Number.isFinite(value) || !Number.isFinite(top)) return 'not-finite';
  if (goal !== undefined && value <= goal) return 'converged';
  const isFlat = top <= gradientTolerance * Math.max(1, Math.abs(value));
  if (goal === undefined) return isFlat ? 'converged' : undefined;
  // near a zero minimum the gradient is small long before the goal: only one that is nothing at all counts
  if (top === 0) return 'stalled';
  const past = history[history.length - 1 - (options.stallIterations ?? STALL_ITERATIONS)];
  const share = options.stallShare ?? STALL_SHARE;
  return past !== undefined && value > past * (1 - share) ? 'stalled' : undefined;
}

function zeros(p: number): Float64Array {
  return new Float64Array(p);
}

export function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let k = 0; k < a.length; k++) sum += a[k]! * b[k]!;
  return sum;
}

/** The largest modulus; NaN when any entry is NaN. */
function largest(a: Float64Array): number {
  let top = 0;
  for (const value of a) {
    const size = Math.abs(value);
    if (!(size <= top)) top = size;
    if (Number.isNaN(top)) return top;
  }
  return top;
}
