import { createRequire } from 'node:module';
import { describe, expect, test } from 'vitest';
import { freeRunning } from '../../src/control.ts';
import { bfgs } from '../../src/optimise/bfgs.ts';
import { lBfgs } from '../../src/optimise/l-bfgs.ts';
import { levenbergMarquardt } from '../../src/optimise/levenberg-marquardt.ts';
import { nelderMead } from '../../src/optimise/nelder-mead.ts';
import type { OptimiserResult } from '../../src/optimise/result.ts';
import { python, pythonTest } from '../support/python.ts';
import { gradientOf, PROBLEMS, type Problem, valueAt } from './problems.ts';

const require = createRequire(import.meta.url);
type Options = { iterationsMax?: number; evaluationsMax?: number; stopped?: () => boolean };
type Run = Generator<void, OptimiserResult>;

function finish(run: Run): OptimiserResult {
  let turn = run.next();
  while (!turn.done) turn = run.next();
  return turn.value;
}

function settings({ iterationsMax = 5000, evaluationsMax = 1e6, stopped }: Options) {
  return {
    iterationsMax,
    evaluationsMax,
    control: stopped ? { ...freeRunning, stopped } : freeRunning,
  };
}

function smooth(problem: Problem) {
  return {
    size: problem.start.length,
    value: (x: Float64Array) => valueAt(problem, x),
    valueAndGradient(x: Float64Array, gradient: Float64Array): number {
      gradient.set(gradientOf(problem, x));
      return valueAt(problem, x);
    },
    linearise(x: Float64Array, normal: Float64Array, gradient: Float64Array): number {
      const p = problem.start.length;
      const j = problem.jacobian(x);
      for (let r = 0; r < p; r++) {
        for (let s = 0; s <= r; s++) {
          normal[r * p + s] = j.reduce((sum, row) => sum + row[r]! * row[s]!, 0);
        }
      }
      gradient.set(gradientOf(problem, x));
      return valueAt(problem, x);
    },
  };
}

const OPTIMISERS: { name: string; run: (problem: Problem, options?: Options) => Run }[] = [
  {
    name: 'Levenberg-Marquardt',
    run: (problem, options = {}) =>
      levenbergMarquardt(smooth(problem), Float64Array.from(problem.start), {
        ...settings(options),
        goal: 1e-18,
      }),
  },
  {
    name: 'BFGS',
    run: (problem, options = {}) =>
      bfgs(smooth(problem), Float64Array.from(problem.start), settings(options)),
  },
  {
    name: 'L-BFGS',
    run: (problem, options = {}) =>
      lBfgs(smooth(problem), Float64Array.from(problem.start), settings(options)),
  },
  {
    name: 'Nelder-Mead',
    run: (problem, options = {}) =>
      nelderMead(smooth(problem), Float64Array.from(problem.start), settings(options)),
  },
];

describe.each(PROBLEMS)('$name', (problem) => {
  test('has the derivatives of its residuals', () => {
    const x = problem.start.map((v, k) => v + 0.1 * (k + 1));
    const j = problem.jacobian(x);
    for (let k = 0; k < x.length; k++) {
      const h = 1e-6;
      const [up, down] = [h, -h].map((d) => x.map((v, i) => (i === k ? v + d : v)));
      const [a, b] = [problem.residuals(up!), problem.residuals(down!)];
      for (const [i, row] of j.entries()) {
        const slope = (a[i]! - b[i]!) / (2 * h);
        expect(Math.abs(row[k]! - slope)).toBeLessThan(1e-6 * (1 + Math.abs(slope)));
      }
    }
  });

  test.each(OPTIMISERS)('$name ends at a published minimum', ({ run }) => {
    const found = finish(run(problem));
    expect(['converged', 'stalled']).toContain(found.status);
    const gap = Math.min(...problem.minima.map((m) => Math.abs(found.value - m)));
    expect(gap).toBeLessThan(1e-5);
    expect(found.value).toBeCloseTo(valueAt(problem, found.x), 12);
  });
});

describe.each(OPTIMISERS)('$name', ({ run }) => {
  const problem = PROBLEMS[0]!;

  test('stops at its limit of iterations and says so', () => {
    const found = finish(run(problem, { iterationsMax: 3 }));
    expect(found).toMatchObject({ status: 'iteration-limit', iterations: 3 });
    expect(found.value).toBeLessThanOrEqual(valueAt(problem, problem.start));
  });

  test('stops on request with the best point so far', () => {
    let asked = 0;
    const found = finish(run(problem, { stopped: () => ++asked > 4 }));
    expect(found.status).toBe('aborted');
    expect(found.iterations).toBe(4);
  });

  test('says that a value is not finite', () => {
    const found = finish(run({ ...problem, start: [Number.NaN, 1] }));
    expect(found.status).toBe('not-finite');
  });
});

test('the limit of evaluations is a status of its own', () => {
  for (const { run } of OPTIMISERS.slice(1)) {
    const found = finish(run(PROBLEMS[0]!, { evaluationsMax: 12 }));
    expect(found.status).toBe('evaluation-limit');
  }
});

test('L-BFGS solves the extended Rosenbrock problem (21) in 100 parameters', () => {
  const valueAndGradient = (x: Float64Array, g: Float64Array): number => {
    let sum = 0;
    for (let k = 0; k < x.length; k += 2) {
      const [u, v] = [10 * (x[k + 1]! - x[k]! ** 2), 1 - x[k]!];
      sum += (u * u + v * v) / 2;
      g[k] = -20 * x[k]! * u - v;
      g[k + 1] = 10 * u;
    }
    return sum;
  };
  const start = Float64Array.from({ length: 100 }, (_, k) => (k % 2 ? 1 : -1.2));
  const found = finish(lBfgs({ size: 100, valueAndGradient }, start, settings({})));
  expect(found.status).toBe('converged');
  for (const x of found.x) expect(x).toBeCloseTo(1, 6);
});

describe('held against other implementations', () => {
  test('fmin reaches no lower value by Nelder-Mead', () => {
    const fmin = require('fmin') as {
      nelderMead(f: (x: number[]) => number, x: number[]): { fx: number };
    };
    for (const problem of PROBLEMS.filter(({ minima }) => minima.length === 1)) {
      const theirs = fmin.nelderMead((x) => valueAt(problem, x), [...problem.start]).fx;
      const ours = finish(OPTIMISERS[3]!.run(problem)).value;
      expect(ours).toBeLessThanOrEqual(theirs + 1e-12);
    }
  });

  test('optimization-js reaches no lower value by L-BFGS', () => {
    const other = require('optimization-js') as {
      minimize_L_BFGS(
        f: (x: number[]) => number,
        g: (x: number[]) => number[],
        x: number[],
      ): { fncvalue: number };
    };
    const problem = PROBLEMS[0]!;
    const theirs = other.minimize_L_BFGS(
      (x) => valueAt(problem, x),
      (x) => gradientOf(problem, x),
      [...problem.start],
    ).fncvalue;
    expect(finish(OPTIMISERS[2]!.run(problem)).value).toBeLessThanOrEqual(theirs + 1e-12);
  });

  pythonTest(
    'SciPy ends at the same minimum of the Rosenbrock and Wood problems, with BFGS and L-BFGS-B',
    () => {
      const theirs = python(`
import json
from math import sqrt
from scipy.optimize import minimize
def rosenbrock(x):
    return ((10*(x[1]-x[0]**2))**2 + (1-x[0])**2)/2
def wood(x):
    a, b, c, d = x
    return (100*(b-a*a)**2 + (1-a)**2 + 90*(d-c*c)**2 + (1-c)**2 + 10*(b+d-2)**2 + (b-d)**2/10)/2
out = []
for f, x in ((rosenbrock, [-1.2, 1]), (wood, [-3, -1, -3, -1])):
    for m in ('BFGS', 'L-BFGS-B'):
        r = minimize(f, x, method=m, options={'gtol': 1e-8, **({'ftol': 1e-16} if m != 'BFGS' else {})})
        out.append(list(r.x))
print(json.dumps(out))
`) as number[][];
      const ours = [PROBLEMS[0]!, PROBLEMS[4]!].flatMap((problem) =>
        [1, 2].map((k) => finish(OPTIMISERS[k]!.run(problem)).x),
      );
      for (const [k, x] of ours.entries()) {
        for (const [i, v] of x.entries()) expect(Math.abs(v - theirs[k]![i]!)).toBeLessThan(1e-4);
      }
    },
    { modules: 'numpy, scipy' },
  );
});
