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
        const [sr, hr] = [step[r]!, hy[r]! / sy];
        for (let c = 0; c < p; c++) {
          h[r * p + c]! += weight * sr * step[c]! - hr * step[c]! - (sr * hy[c]!) / sy;
        }
      }
    },
    forget() {
      isEmpty = true;
    },
  };
}

function multiplyInto(out: Float64Array, h: Float64Array, v: Float64Array, p: number): void {
  for (let r = 0; r < p; r++) {
    let sum = 0;
    for (let c = 0; c < p; c++) sum += h[r * p + c]! * v[c]!;
    out[r] = sum;
  }
}
