/**
 * Test problems with known minima. Source: More, Garbow, Hillstrom, Testing unconstrained optimization software, ACM TOMS
 * 7, 17 (1981); the number of each problem there stands beside it.
 */
/** Long enough for every problem that reads it. */
export type Point =
  | readonly [number, number, number, number]
  | (ArrayLike<number> & Iterable<number>);

export type Problem = {
  name: string;
  start: readonly number[];
  /** The values of all known minima. */
  minima: readonly number[];
  /** The residuals; the objective is half the sum of their squares. */
  residuals(x: Point): number[];
  jacobian(x: Point): number[][];
};

export const PROBLEMS: readonly Problem[] = [
  {
    name: 'Rosenbrock (1)',
    start: [-1.2, 1],
    minima: [0],
    residuals: ([a, b]) => [10 * (b - a * a), 1 - a],
    jacobian: ([a]) => [
      [-20 * a, 10],
      [-1, 0],
    ],
  },
  {
    name: 'Freudenstein and Roth (2)',
    start: [0.5, -2],
    minima: [0, 48.98425 / 2],
    residuals: ([a, b]) => [-13 + a + ((5 - b) * b - 2) * b, -29 + a + ((b + 1) * b - 14) * b],
    jacobian: ([, b]) => [
      [1, 10 * b - 3 * b * b - 2],
      [1, 3 * b * b + 2 * b - 14],
    ],
  },
  {
    name: 'Beale (5)',
    start: [1, 1],
    minima: [0],
    residuals: ([a, b]) => [1.5, 2.25, 2.625].map((y, i) => y - a * (1 - b ** (i + 1))),
    jacobian: ([a, b]) => [0, 1, 2].map((i) => [b ** (i + 1) - 1, a * (i + 1) * b ** i]),
  },
  {
    name: 'Powell singular (13)',
    start: [3, -1, 0, 1],
    minima: [0],
    residuals: ([a, b, c, d]) => [
      a + 10 * b,
      Math.sqrt(5) * (c - d),
      (b - 2 * c) ** 2,
      Math.sqrt(10) * (a - d) ** 2,
    ],
    jacobian: ([a, b, c, d]) => [
      [1, 10, 0, 0],
      [0, 0, Math.sqrt(5), -Math.sqrt(5)],
      [0, 2 * (b - 2 * c), -4 * (b - 2 * c), 0],
      [2 * Math.sqrt(10) * (a - d), 0, 0, -2 * Math.sqrt(10) * (a - d)],
    ],
  },
  {
    name: 'Wood (14)',
    start: [-3, -1, -3, -1],
    minima: [0],
    residuals: ([a, b, c, d]) => [
      10 * (b - a * a),
      1 - a,
      Math.sqrt(90) * (d - c * c),
      1 - c,
      Math.sqrt(10) * (b + d - 2),
      (b - d) / Math.sqrt(10),
    ],
    jacobian: ([a, , c]) => [
      [-20 * a, 10, 0, 0],
      [-1, 0, 0, 0],
      [0, 0, -2 * Math.sqrt(90) * c, Math.sqrt(90)],
      [0, 0, -1, 0],
      [0, Math.sqrt(10), 0, Math.sqrt(10)],
      [0, 1 / Math.sqrt(10), 0, -1 / Math.sqrt(10)],
    ],
  },
];

export function valueAt(problem: Problem, x: Point): number {
  return problem.residuals(x).reduce((sum, r) => sum + r * r, 0) / 2;
}

export function gradientOf(problem: Problem, x: Point): number[] {
  const r = problem.residuals(x);
  const j = problem.jacobian(x);
  return problem.start.map((_, k) => r.reduce((sum, v, i) => sum + v * j[i]![k]!, 0));
}
