/**
 * Writes a diagonal unitary as CX and Rz, with at most 2^n - 2 CX on n wires.
 *
 * Shape: u is 2^n x 2^n, planar. Result: gates equal to u up to a phase.
 * Method: the phases are a sum of parities, phi(x) = sum_m a_m (-1)^{m.x}, by the Walsh-Hadamard transform; for each wire a
 * Gray code runs through the parities that contain it and earlier wires, one CX a step, with Rz(-2 a_m) on the parity that
 * is there (Bullock, Markov, QIC 4, 27 (2004); Welch, Greenbaum, Mostame, Aspuru-Guzik, New J. Phys. 16, 033040 (2014)).
 * Changed: where an angle is zero the CX around it share a target, commute, and cancel in pairs.
 */
import { type GateOperation, gate } from '../circuit/circuit.ts';

/** Entries off the diagonal below this count as zero. */
const DIAGONAL_TOLERANCE = 1e-12;
const ANGLE_TOLERANCE = 1e-12;

export function isDiagonal(u: Float64Array, wires: number): boolean {
  const d = 2 ** wires;
  for (let i = 0; i < d; i++) {
    for (let j = 0; j < d; j++) {
      if (i === j) continue;
      if (Math.hypot(u[i * d + j]!, u[d * d + i * d + j]!) > DIAGONAL_TOLERANCE) return false;
    }
  }
  return true;
}

export function diagonalGates(u: Float64Array, wires: number): GateOperation[] {
  const weights = parityWeights(u, wires);
  const out: GateOperation[] = [];
  for (let target = 0; target < wires; target++) {
    const own = 2 ** (wires - 1 - target);
    // odd number of CX from each control wait here until a rotation needs the parity
    let waiting = 0;
    let mask = 0;
    for (let step = 0; step < 2 ** target; step++) {
      const parity = own + mask;
      const angle = -2 * weights[parity]!;
      if (Math.abs(angle) > ANGLE_TOLERANCE) {
        out.push(...released(waiting, target, wires));
        waiting = 0;
        out.push(gate('rz', [target], angle));
      }
      if (target === 0) break;
      // the Gray code changes bit `low` of the subset next; the last step goes back to the empty subset
      const isLast = step === 2 ** target - 1;
      const low = isLast ? target - 1 : 31 - Math.clz32((step + 1) & -(step + 1));
      const control = 2 ** (wires - 1 - (target - 1 - low));
      mask ^= control;
      waiting ^= control;
    }
    out.push(...released(waiting, target, wires));
  }
  return out;
}

function released(controls: number, target: number, wires: number): GateOperation[] {
  const out: GateOperation[] = [];
  for (let wire = 0; wire < wires; wire++) {
    if (controls & (2 ** (wires - 1 - wire))) out.push(gate('cx', [wire, target]));
  }
  return out;
}

/** a_m for every parity m; bit 2^(n-1-wire) of m says that the wire is in it. */
function parityWeights(u: Float64Array, wires: number): Float64Array {
  const d = 2 ** wires;
  const out = new Float64Array(d);
  for (let x = 0; x < d; x++) out[x] = Math.atan2(u[d * d + x * d + x]!, u[x * d + x]!);
  for (let half = 1; half < d; half *= 2) {
    for (let x = 0; x < d; x++) {
      if (x & half) continue;
      const [a, b] = [out[x]!, out[x + half]!];
      out[x] = a + b;
      out[x + half] = a - b;
    }
  }
  return out.map((value) => value / d);
}
