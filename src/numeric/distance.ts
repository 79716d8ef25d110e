/**
 * Measures how far two unitaries are from each other when a global phase does not count.
 *
 * Shape: u and v are d x d, row-major, planar.
 * Convention: with t = Tr(u^dag v) and phi its phase,
 *   hilbertSchmidt    D = 1 - |t| / d
 *   processInfidelity 1 - |t|^2 / d^2 = D (2 - D)
 *   angle             arccos(|t| / d)
 * Method: D = ||u - e^{-i phi} v||_F^2 / (2 d), which has no cancellation and is right down to 1e-30
 * (expand the square: 2d - 2|t|). The formula assumes both are unitary to rounding. Average gate fidelity is
 * (d F + 1)/(d + 1) with F = 1 - processInfidelity (Nielsen, Phys. Lett. A 303, 249 (2002)).
 * Cost: 16 d^2 flops.
 */
import { innerProduct } from './complex-matrix.ts';

/** D and the phase phi of Tr(u^dag v); v is nearest to e^{i phi} u. */
export function hilbertSchmidtDistance(
  u: Float64Array,
  v: Float64Array,
): { distance: number; phase: number } {
  const [re, im] = innerProduct(u, v);
  const phase = Math.atan2(im, re);
  const c = Math.cos(phase);
  const s = -Math.sin(phase);
  const half = u.length / 2;
  let sum = 0;
  for (let i = 0; i < half; i++) {
    const x = u[i]! - (c * v[i]! - s * v[half + i]!);
    const y = u[half + i]! - (c * v[half + i]! + s * v[i]!);
    sum += x * x + y * y;
  }
  return { distance: sum / (2 * Math.sqrt(half)), phase };
}

/** 1 - F = D (2 - D). */
export function processInfidelity(distance: number): number {
  return distance * (2 - distance);
}

/** The angle arccos(1 - D), without cancellation: 2 arcsin(sqrt(D / 2)). */
export function distanceAngle(distance: number): number {
  return 2 * Math.asin(Math.sqrt(Math.min(1, Math.max(0, distance / 2))));
}

/** D = 1 - sqrt(1 - e) for a process infidelity e, without cancellation. */
export function distanceFromInfidelity(infidelity: number): number {
  const e = Math.min(1, Math.max(0, infidelity));
  return e / (1 + Math.sqrt(1 - e));
}
