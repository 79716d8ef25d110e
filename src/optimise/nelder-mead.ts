/**
 * Minimises a function without derivatives by the simplex method of Nelder and Mead.
 *
 * Method: Nelder and Mead, Comput. J. 7, 308 (1965), with the coefficients that depend on the number of parameters of Gao
 * and Han, Comput. Optim. Appl. 51, 259 (2012), section 4.
 * Changed: when the simplex has collapsed, a new one is put up around the best vertex, its edges turned the other way,
 * until that no longer gains anything or `restartsMax` is used up.
 * Cost: one or two evaluations an iteration, p after a shrink.
 * Fails: never; the status says why it stopped, and x is the best point seen.
 */
import type { Control } from '../control.ts';
import type { OptimiserResult, Status } from './result.ts';

export type ValueProblem = { size: number; value(x: Float64Array): number };

export type NelderMeadOptions = {
  /** Converged at a value at most this. Without a goal, a collapsed simplex that restarts do not move is converged. */
  goal?: number;
  iterationsMax: number;
  evaluationsMax?: number;
  /** Edge of the first simplex. */
  edge?: number;
  /** Collapsed once vertices and values differ by less than these, the latter relative to max(1e-12, |value|). */
  toleranceX?: number;
  toleranceValue?: number;
  restartsMax?: number;
  control: Control;
  onIteration?: (iteration: number, value: number, x: Float64Array) => void;
};

const EDGE = 0.5;
const TOLERANCE_X = 1e-9;
const TOLERANCE_VALUE = 1e-12;
const RESTARTS_MAX = 10;

type Vertex = { x: Float64Array; value: number };

/** Runs until the goal, a collapse, a limit or a stop; yields between iterations so that a caller may pause. */
export function* nelderMead(
  problem: ValueProblem,
  start: Float64Array,
  options: NelderMeadOptions,
): Generator<void, OptimiserResult> {
  const { goal = Number.NEGATIVE_INFINITY, iterationsMax, control } = options;
  const evaluationsMax = options.evaluationsMax ?? Number.POSITIVE_INFINITY;
  const restartsMax = options.restartsMax ?? RESTARTS_MAX;
  let evaluations = 0;
  let iterations = 0;
  const evaluate = (x: Float64Array): Vertex => {
    evaluations++;
    const value = problem.value(x);
    return { x, value: Number.isNaN(value) ? Number.POSITIVE_INFINITY : value };
  };
  const simplexAround = (centre: Vertex, edge: number): Vertex[] => {
    const vertices = [centre];
    for (let k = 0; k < problem.size; k++) {
      const x = centre.x.slice();
      x[k]! += edge;
      vertices.push(evaluate(x));
    }
    return sorted(vertices);
  };
  const first = evaluate(start.slice());
  const result = (best: Vertex, status: Status): OptimiserResult => {
    return { x: best.x.slice(), value: best.value, status, iterations, evaluations };
  };
  if (!Number.isFinite(first.value)) return result(first, 'not-finite');
  let edge = options.edge ?? EDGE;
  let simplex = simplexAround(first, edge);
  let valueAtRestart = first.value;
  let restarts = 0;
  while (true) {
    const best = simplex[0]!;
    if (best.value <= goal) return result(best, 'converged');
    if (iterations >= iterationsMax) return result(best, 'iteration-limit');
    if (evaluations >= evaluationsMax) return result(best, 'evaluation-limit');
    if (control.stopped()) return result(best, 'aborted');
    if (hasCollapsed(simplex, options)) {
      const gain = valueAtRestart - best.value;
      const isWorthIt = restarts === 0 || gain > 1e-9 * Math.max(1e-12, Math.abs(best.value));
      if (restarts >= restartsMax || !isWorthIt) {
        return result(best, options.goal === undefined ? 'converged' : 'stalled');
      }
      restarts++;
      valueAtRestart = best.value;
      edge = -edge / 2;
      simplex = simplexAround(best, edge);
      continue;
    }
    advance(simplex, evaluate);
    simplex = sorted(simplex);
    iterations++;
    options.onIteration?.(iterations, simplex[0]!.value, simplex[0]!.x);
    yield;
  }
}

/** One step of the method on a simplex sorted by value; it is sorted no longer afterwards. */
function advance(simplex: Vertex[], evaluate: (x: Float64Array) => Vertex): void {
  const p = simplex.length - 1;
  // Gao and Han's section 4 wants p >= 2; one parameter takes the classical coefficients, those of p = 2
  const q = Math.max(2, p);
  const [expansion, contraction, shrinkage] = [1 + 2 / q, 0.75 - 1 / (2 * q), 1 - 1 / q];
  const worst = simplex[p]!;
  const centre = new Float64Array(p);
  for (let v = 0; v < p; v++) {
    for (let k = 0; k < p; k++) centre[k]! += simplex[v]!.x[k]! / p;
  }
  const along = (factor: number): Vertex =>
    evaluate(centre.map((c, k) => c + factor * (c - worst.x[k]!)));
  const reflected = along(1);
  if (reflected.value < simplex[0]!.value) {
    const expanded = along(expansion);
    simplex[p] = expanded.value < reflected.value ? expanded : reflected;
    return;
  }
  if (reflected.value < simplex[p - 1]!.value) {
    simplex[p] = reflected;
    return;
  }
  const isOutside = reflected.value < worst.value;
  const contracted = along(isOutside ? contraction : -contraction);
  if (contracted.value < (isOutside ? reflected.value : worst.value)) {
    simplex[p] = contracted;
    return;
  }
  const best = simplex[0]!.x;
  for (let v = 1; v <= p; v++) {
    simplex[v] = evaluate(simplex[v]!.x.map((x, k) => best[k]! + shrinkage * (x - best[k]!)));
  }
}

function hasCollapsed(simplex: readonly Vertex[], options: NelderMeadOptions): boolean {
  const { toleranceX = TOLERANCE_X, toleranceValue = TOLERANCE_VALUE } = options;
  const [best, worst] = [simplex[0]!, simplex[simplex.length - 1]!];
  const spread = worst.value - best.value;
  if (!(spread <= toleranceValue * Math.max(1e-12, Math.abs(best.value)))) {
    // flat to rounding in x is a collapse whatever the values
    return simplex.every(({ x }) => x.every((v, k) => Math.abs(v - best.x[k]!) <= 1e-15));
  }
  return simplex.every(({ x }) => x.every((v, k) => Math.abs(v - best.x[k]!) <= toleranceX));
}

/** Stable, so that equal values keep their order. */
function sorted(simplex: readonly Vertex[]): Vertex[] {
  return [...simplex].sort((a, b) => a.value - b.value);
}
