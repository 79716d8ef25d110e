/**
 * Writes a rotation whose angle depends on the basis state of other wires: a multiplexed rotation.
 *
 * Shape: angles has 2^k entries, one per basis state of the k controls, the first control most significant; axis y or z.
 * Method: the angle is a sum of parities, angle(x) = sum_m a_m (-1)^{m.x}, by the Walsh-Hadamard transform; a Gray code runs
 * through the m, one gate a step that flips the sign of the rotations after it: CX for z, CZ for y (Mottonen, Vartiainen,
 * Bergholm, Salomaa, PRL 93, 130502 (2004); Shende, Bullock, Markov, IEEE TCAD 25, 1000 (2006), theorem 8).
 * Changed: rotations by zero are left out, and the flips around them cancel in pairs. The flips left at the end are
 * returned as `open` (bit k-1-j for control j) and not written: the caller writes them or puts them into what follows.
 * Cost: at most 2^k flips, the last of them open.
 */
import { type GateOperation, gate } from '../circuit/circuit.ts';

/** Rotations by less than this, in radians, are left out. */
const ANGLE_TOLERANCE = 1e-14;

export type Multiplexed = { operations: GateOperation[]; open: number };

export function multiplexedRotation(
  axis: 'y' | 'z',
  target: number,
  controls: readonly number[],
  angles: Float64Array,
): Multiplexed {
  const weights = walshHadamard(angles);
  const operations: GateOperation[] = [];
  const k = controls.length;
  let mask = 0;
  let waiting = 0;
  for (let step = 0; step < 2 ** k; step++) {
    const angle = weights[mask]!;
    if (Math.abs(angle) > ANGLE_TOLERANCE) {
      operations.push(...flips(axis, target, controls, waiting));
      waiting = 0;
      operations.push(gate(`r${axis}`, [target], angle));
    }
    if (k === 0) break;
    const isLast = step === 2 ** k - 1;
    const change = isLast ? 2 ** (k - 1) : (step + 1) & -(step + 1);
    mask ^= change;
    waiting ^= change;
  }
  return { operations, open: waiting };
}

/** The flips of a mask, as gates. */
export function flips(
  axis: 'y' | 'z',
  target: number,
  controls: readonly number[],
  mask: number,
): GateOperation[] {
  return controls.flatMap((control, j) =>
    mask & (2 ** (controls.length - 1 - j))
      ? [axis === 'z' ? gate('cx', [control, target]) : gate('cz', [control, target])]
      : [],
  );
}

function walshHadamard(values: Float64Array): Float64Array {
  const out = values.slice();
  for (let half = 1; half < out.length; half *= 2) {
    for (let x = 0; x < out.length; x++) {
      if (x & half) continue;
      const [a, b] = [out[x]!, out[x + half]!];
      out[x] = a + b;
      out[x + half] = a - b;
    }
  }
  return out.map((value) => value / out.length);
}
