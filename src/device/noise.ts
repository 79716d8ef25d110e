/**
 * The noise channels of a device, as superoperators on one or two wires.
 *
 * Shape: a channel on k wires is a 4^k x 4^k matrix, row-major, planar, on the pair (row index, column index)
 * of a density matrix: entry (r c, r' c') = sum_a K_a[r, r'] conj(K_a[c, c']).
 * Source: T1/T2 channel (amplitude damping, then dephasing to the given T2), Nielsen, Chuang, Quantum
 * Computation and Quantum Information, section 8.3; depolarising with probability p on D levels:
 * rho -> (1 - p) rho + p Tr(rho) 1/D, whose average infidelity is p (D - 1)/D.
 */

/** Kraus operators, each planar of the same size. */
export type Kraus = readonly Float64Array[];

/** Depolarising probability of a gate with average infidelity e on k wires: p = e D/(D - 1), at most 1. */
export function depolarisingProbability(error: number, k: number): number {
  const d = 2 ** k;
  return Math.min(1, (error * d) / (d - 1));
}

/** Superoperator of depolarising with probability p on k wires. */
export function depolarising(p: number, k: number): Float64Array {
  const d = 2 ** k;
  const size = d * d;
  const out = new Float64Array(2 * size * size);
  for (let i = 0; i < size; i++) out[i * size + i] = 1 - p;
  for (let r = 0; r < d; r++) {
    for (let s = 0; s < d; s++) out[(r * d + r) * size + s * d + s]! += p / d;
  }
  return out;
}

/** Kraus operators of waiting t ns: amplitude damping by T1, then dephasing so that coherences decay by T2. */
export function idleKraus(tNs: number, t1Us: number | undefined, t2Us: number | undefined): Kraus {
  const tUs = tNs / 1000;
  const gamma = t1Us === undefined ? 0 : -Math.expm1(-tUs / t1Us);
  const kept = Math.sqrt(1 - gamma);
  const wanted = t2Us === undefined ? kept : Math.min(kept, Math.exp(-tUs / t2Us));
  // dephasing factor f = 1 - 2 q on top of the sqrt(1 - gamma) of the damping
  const f = kept > 0 ? wanted / kept : 1;
  const q = (1 - f) / 2;
  const kraus: Float64Array[] = [];
  for (const [weight, sign] of [
    [1 - q, 1],
    [q, -1],
  ] as const) {
    if (weight <= 0) continue;
    const w = Math.sqrt(weight);
    kraus.push(new Float64Array([w, 0, 0, sign * w * kept, 0, 0, 0, 0]));
    if (gamma > 0) kraus.push(new Float64Array([0, w * Math.sqrt(gamma), 0, 0, 0, 0, 0, 0]));
  }
  return kraus;
}

/** Sum of K x conj(K): the superoperator of Kraus operators on k wires. */
export function superoperator(kraus: Kraus, k: number): Float64Array {
  const d = 2 ** k;
  const size = d * d;
  const out = new Float64Array(2 * size * size);
  for (const a of kraus) {
    for (let r = 0; r < d; r++) {
      for (let c = 0; c < d; c++) {
        for (let s = 0; s < d; s++) {
          for (let t = 0; t < d; t++) {
            const [ar, ai] = [a[r * d + s]!, a[d * d + r * d + s]!];
            const [br, bi] = [a[c * d + t]!, a[d * d + c * d + t]!];
            const at = (r * d + c) * size + s * d + t;
            out[at]! += ar * br + ai * bi;
            out[size * size + at]! += ai * br - ar * bi;
          }
        }
      }
    }
  }
  return out;
}
