/**
 * Minimises a smooth function by BFGS with a strong Wolfe line search.
 *
 * Shape: H, the estimate of the inverse Hessian, is p x p, row-major.
 * Method: Nocedal and Wright, Numerical Optimization, 2nd ed. (2006), algorithm 6.1 with the update 6.17 and the first
 * scaling 6.20; loop in descent.ts.
 * Cost: about 3 p^2 multiply-adds an iteration.
 * Fails: as said in descent.ts.
 */
import {
  type DescentOptions,
  type Direction,
  descend,
  dot,
  type GradientProblem,
} from './descent.ts';
import type { OptimiserResult } from './result.ts';

export function bfgs(
  problem: GradientProblem,
  start: Float64Array,
  options: DescentOptions,
): Generator<void, OptimiserResult> {
  return descend(problem, start, inverseHessian(problem.size), options);
}

function inverseHessian(p: number): Direction {
  const h = new Float64Array(p * p);
  const hy = new Float64Array(p);
  let isEmpty = true;
  return {
    pointInto(out, gradient) {
      if (isEmpty) {
        for (let k = 0; k < p; k++) out[k] = -gradient[k]!;
        return;
      }
      multiplyInto(out, h, gradient, p);
      for (let k = 0; k < p; k++) out[k] = -out[k]!;
    },
    learn(step, change) {
      const sy = dot(step, change);
      if (isEmpty) {
        const scale = sy / dot(change, change);
        h.fill(0);
        for (let k = 0; k < p; k++) h[k * p + k] = scale;
        isEmpty = false;
      }
      multiplyInto(hy, h, change, p);
      const weight = (1 + dot(change, hy) / sy) / sy;
      for (let r = 0; r < p; r++) {
        const ofY = step[r]! / sy;
        const ofS = weight * step[r]! - hy[r]! / sy;
        const row = r * p;
        for (let c = 0; c < p; c++) h[row + c]! += ofS * step[c]! - ofY * hy[c]!;
      }
    },
    forget() {
      isEmpty = true;
    },
  };
}

/** out = h v, with four sums apart so that they do not wait for each other. */
function multiplyInto(out: Float64Array, h: Float64Array, v: Float64Array, p: number): void {
  const end = p - (p % 4);
  for (let r = 0; r < p; r++) {
    const row = r * p;
    let [a, b, c, d] = [0, 0, 0, 0];
    for (let k = 0; k < end; k += 4) {
      a += h[row + k]! * v[k]!;
      b += h[row + k + 1]! * v[k + 1]!;
      c += h[row + k + 2]! * v[k + 2]!;
      d += h[row + k + 3]! * v[k + 3]!;
    }
    for (let k = end; k < p; k++) a += h[row + k]! * v[k]!;
    out[r] = a + b + (c + d);
  }
}
