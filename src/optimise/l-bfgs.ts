/**
 * Minimises a smooth function of many parameters by limited-memory BFGS with a strong Wolfe line search.
 *
 * Method: the two-loop recursion, Nocedal, Math. Comp. 35, 773 (1980); Nocedal and Wright, Numerical Optimization,
 * 2nd ed. (2006), algorithms 7.4 and 7.5 with the scaling 7.20; loop in descent.ts.
 * Cost: 4 m p multiply-adds an iteration for m pairs kept.
 * Fails: as said in descent.ts.
 * Symbols: s = step, y = change of the gradient, m = `memory`.
 */
import {
  type DescentOptions,
  type Direction,
  descend,
  dot,
  type GradientProblem,
} from './descent.ts';
import type { OptimiserResult } from './result.ts';

/** Pairs kept unless the options say otherwise. */
const MEMORY = 20;

export function lBfgs(
  problem: GradientProblem,
  start: Float64Array,
  options: DescentOptions & { memory?: number },
): Generator<void, OptimiserResult> {
  return descend(problem, start, recentPairs(options.memory ?? MEMORY), options);
}

type Pair = { s: Float64Array; y: Float64Array; rho: number };

function recentPairs(memory: number): Direction {
  let pairs: Pair[] = [];
  return {
    pointInto(out, gradient) {
      out.set(gradient);
      const alphas: number[] = [];
      for (let k = pairs.length - 1; k >= 0; k--) {
        const { s, y, rho } = pairs[k]!;
        const alpha = rho * dot(s, out);
        alphas[k] = alpha;
        addInto(out, y, -alpha);
      }
      const last = pairs[pairs.length - 1];
      const scale = last ? 1 / (last.rho * dot(last.y, last.y)) : 1;
      for (let k = 0; k < out.length; k++) out[k]! *= scale;
      pairs.forEach(({ s, y, rho }, k) => {
        addInto(out, s, alphas[k]! - rho * dot(y, out));
      });
      for (let k = 0; k < out.length; k++) out[k] = -out[k]!;
    },
    learn(step, change) {
      pairs.push({ s: step.slice(), y: change.slice(), rho: 1 / dot(step, change) });
      if (pairs.length > memory) pairs.shift();
    },
    forget() {
      pairs = [];
    },
  };
}

function addInto(out: Float64Array, v: Float64Array, factor: number): void {
  for (let k = 0; k < out.length; k++) out[k]! += factor * v[k]!;
}
