/**
 * Finds a step length along a descent direction that meets the strong Wolfe conditions.
 *
 * Method: bracketing and zoom, Nocedal and Wright, Numerical Optimization, 2nd ed. (2006), algorithms 3.5 and 3.6,
 * with the cubic interpolation of equation 3.59.
 * Changed: a trial closer than a tenth of the bracket to one of its ends is replaced by the midpoint; a value that is not
 * finite counts as too high; at the limit of evaluations, the lower end is returned if it lies below the start.
 * Cost: one value and slope per trial, at most `EVALUATIONS_MAX`.
 * Fails: no lower point found; then returns undefined.
 */
export type LinePoint = { length: number; value: number; slope: number };

/** Sufficient decrease and curvature: the constants c1, c2 of the source, section 3.1. */
export const DECREASE = 1e-4;
export const CURVATURE = 0.9;
const EVALUATIONS_MAX = 30;
const LENGTH_MAX = 1e10;

/** `at(length)` gives value and slope there; `start` is the point of length 0, with a slope below 0. */
export function strongWolfe(
  at: (length: number) => LinePoint,
  start: LinePoint,
  firstLength: number,
): LinePoint | undefined {
  let used = 0;
  let last: LinePoint | undefined;
  const look = (length: number): LinePoint => {
    used++;
    last = at(length);
    return last;
  };
  const isTooHigh = (p: LinePoint): boolean =>
    !(p.value <= start.value + DECREASE * p.length * start.slope);
  const isFlat = (p: LinePoint): boolean => Math.abs(p.slope) <= -CURVATURE * start.slope;
  /** The caller reads what `at` left behind, so the point returned must be the last one looked at. */
  const settle = (p: LinePoint): LinePoint | undefined => {
    if (p.length === 0 || !(p.value < start.value)) return undefined;
    return last?.length === p.length ? p : at(p.length);
  };
  const zoom = (from: LinePoint, to: LinePoint): LinePoint | undefined => {
    let [low, high] = [from, to];
    while (used < EVALUATIONS_MAX) {
      const trial = look(between(low, high));
      if (isTooHigh(trial) || trial.value >= low.value) {
        high = trial;
      } else {
        if (isFlat(trial)) return trial;
        if (trial.slope * (high.length - low.length) >= 0) high = low;
        low = trial;
      }
      if (Math.abs(high.length - low.length) <= 1e-15 * Math.max(low.length, high.length)) break;
    }
    return settle(low);
  };
  let previous = start;
  let length = firstLength;
  while (used < EVALUATIONS_MAX) {
    const point = look(length);
    if (isTooHigh(point) || (used > 1 && point.value >= previous.value)) {
      return zoom(previous, point);
    }
    if (isFlat(point)) return point;
    if (point.slope >= 0) return zoom(point, previous);
    previous = point;
    length *= 2;
    if (length > LENGTH_MAX) break;
  }
  return settle(previous);
}

/** The minimum of the cubic through both ends, kept inside the bracket. */
function between(a: LinePoint, b: LinePoint): number {
  const span = b.length - a.length;
  const middle = a.length + span / 2;
  const d1 = a.slope + b.slope - (3 * (a.value - b.value)) / (a.length - b.length);
  const d2 = Math.sign(span) * Math.sqrt(d1 * d1 - a.slope * b.slope);
  const cubic = b.length - (span * (b.slope + d2 - d1)) / (b.slope - a.slope + 2 * d2);
  const share = (cubic - a.length) / span;
  return share > 0.1 && share < 0.9 ? cubic : middle;
}
