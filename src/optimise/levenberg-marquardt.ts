/**
 * Minimises a sum of squares F(x) = |r(x)|^2 / 2 by damped Gauss-Newton steps.
 *
 * Shape: x has p entries; `normal` is p x p, row-major, of which only the lower triangle is read and written.
 * Method: (N + lambda D) s = -g with N = J^T J, g = J^T r, D the diagonal of N kept away from zero; lambda follows the
 * ratio of the actual to the predicted decrease: Levenberg, Q. Appl. Math. 2, 164 (1944); Marquardt, J. SIAM 11, 431
 * (1963); the update rule is H. B. Nielsen, Damping parameter in Marquardt's method, IMM-REP-1999-05 (1999), eq. 2.21.
 * Changed: directions that J does not see (rank-deficient N) are held by a floor under D, so the step is finite and
 * short there. The damping falls tenfold where the model is good, and with a power of F near a zero, as in J. Fan,
 * Y. Yuan, Computing 74, 23 (2005), which makes the last steps quadratic. After `goal` is reached the loop goes on
 * while a step still gains a factor of two, which takes the value down to rounding.
 * Cost: one linearisation and p^3/3 flops per iteration.
 * Fails: never; the status says why it stopped, and x is the best point seen.
 */
import type { Control } from '../control.ts';
import { kernels } from '../numeric/kernels/kernels.ts';
import type { OptimiserResult, Status } from './result.ts';

export type NormalProblem = {
  size: number;
  /** F at x. */
  value(x: Float64Array): number;
  /** F at x; fills the lower triangle of N and g. */
  linearise(x: Float64Array, normal: Float64Array, gradient: Float64Array): number;
};

export type LevenbergMarquardtOptions = {
  goal: number;
  /** Rounding of the value: at or below it no further step can gain. */
  floor?: number;
  iterationsMax: number;
  /** First damping, relative to the largest diagonal entry. */
  dampingStart?: number;
  /** Stalled when F falls by less than this share over `stallIterations`. */
  stallShare?: number;
  stallIterations?: number;
  control: Control;
  onIteration?: (iteration: number, value: number, x: Float64Array) => void;
};

const DAMPING_START = 1e-2;
/** At most this share of the damping goes in one accepted step; a refused step multiplies it by `GROWTH` at first. */
const SHRINK = 0.1;
const GROWTH = 3;
/** Where the residual vanishes the damping does too: at most (F / largest diagonal entry) to this power. */
const DAMPING_POWER = 0.75;
const DAMPING_MIN = 1e-15;
const STALL_SHARE = 0.05;
const STALL_ITERATIONS = 40;
const POLISH_ITERATIONS_MAX = 8;

/** Runs until the goal, a stall, the limit or a stop; yields between iterations so that a caller may pause. */
export function* levenbergMarquardt(
  problem: NormalProblem,
  start: Float64Array,
  options: LevenbergMarquardtOptions,
): Generator<void, OptimiserResult> {
  const { goal, iterationsMax, control, onIteration } = options;
  const floor = Math.min(goal, options.floor ?? 0);
  const p = problem.size;
  const x = start.slice();
  const trial = new Float64Array(p);
  const step = new Float64Array(p);
  const normal = new Float64Array(p * p);
  const shift = new Float64Array(p);
  const scale = new Float64Array(p);
  const gradient = new Float64Array(p);
  let value = problem.linearise(x, normal, gradient);
  let evaluations = 1;
  let damping = 0;
  let growth = GROWTH;
  let polish = 0;
  let status: Status = 'iteration-limit';
  const history: number[] = [value];
  let iteration = 0;
  for (; iteration < iterationsMax; iteration++) {
    if (!Number.isFinite(value)) {
      status = 'not-finite';
      break;
    }
    if (value <= goal && polish++ >= POLISH_ITERATIONS_MAX) {
      status = 'converged';
      break;
    }
    if (control.stopped()) {
      status = 'aborted';
      break;
    }
    const top = diagonalInto(scale, normal, p);
    if (damping === 0) damping = options.dampingStart ?? DAMPING_START;
    for (let k = 0; k < p; k++) scale[k] = Math.max(scale[k]!, 1e-3 * top);
    let isAccepted = false;
    let before = value;
    for (let attempt = 0; attempt < 40; attempt++) {
      const predicted = solveStep(step, shift, normal, gradient, scale, damping, p);
      if (predicted > 0) {
        for (let k = 0; k < p; k++) trial[k] = x[k]! + step[k]!;
        const next = problem.value(trial);
        evaluations++;
        const ratio = (value - next) / predicted;
        if (Number.isFinite(next) && next < value) {
          damping *= Math.max(SHRINK, 1 - (2 * Math.min(ratio, 1) - 1) ** 3);
          damping = Math.max(Math.min(damping, (next / top) ** DAMPING_POWER), DAMPING_MIN);
          growth = GROWTH;
          isAccepted = true;
          before = value;
          value = next;
          x.set(trial);
          break;
        }
      }
      damping *= growth;
      growth = Math.min(growth * 2, 1024);
      if (damping > 1e12) break;
    }
    if (!isAccepted) {
      status = value <= goal ? 'converged' : 'stalled';
      break;
    }
    onIteration?.(iteration + 1, value, x);
    if (value <= floor || (value <= goal && value > before / 2)) {
      status = 'converged';
      iteration++;
      break;
    }
    history.push(value);
    const span = options.stallIterations ?? STALL_ITERATIONS;
    const past = history[history.length - 1 - span];
    if (
      value > goal &&
      past !== undefined &&
      value > past * (1 - (options.stallShare ?? STALL_SHARE))
    ) {
      status = 'stalled';
      iteration++;
      break;
    }
    problem.linearise(x, normal, gradient);
    yield;
  }
  if (status === 'iteration-limit' && value <= goal) status = 'converged';
  return { x, value, status, iterations: iteration, evaluations };
}

function diagonalInto(out: Float64Array, normal: Float64Array, p: number): number {
  let top = 0;
  for (let k = 0; k < p; k++) {
    out[k] = normal[k * p + k]!;
    top = Math.max(top, out[k]!);
  }
  return top || 1;
}

/** Solves for the step; returns the decrease that the model predicts, or -1 when the factor fails. */
function solveStep(
  step: Float64Array,
  shift: Float64Array,
  normal: Float64Array,
  gradient: Float64Array,
  scale: Float64Array,
  damping: number,
  p: number,
): number {
  for (let k = 0; k < p; k++) {
    shift[k] = damping * scale[k]!;
    step[k] = -gradient[k]!;
  }
  if (!kernels.solveInto(step, normal, shift, p)) return -1;
  // F(0) - model(s) = -g s - s N s / 2 = -g s / 2 + lambda s D s / 2, as (N + lambda D) s = -g
  let predicted = 0;
  for (let k = 0; k < p; k++) {
    predicted += step[k]! * (shift[k]! * step[k]! - gradient[k]!);
  }
  return predicted / 2;
}
