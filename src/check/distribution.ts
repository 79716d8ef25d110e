/**
 * Compares two circuits that start in |0> and end in bits alone, by the distributions of their bits.
 *
 * Quantity: D = (1/2) sum_m (sqrt p_m - sqrt q_m)^2, which is what `channel-distance.ts` gives when every outcome is
 * one row (1 - D is the fidelity of the two distributions); here in two flat arrays of 2^bits probabilities, so that
 * twenty bits and more fit into memory.
 * Cost: 2^axes steps and 2^(bits + 4) bytes.
 */
import { type BitExpression, evaluateBits } from '../circuit/circuit.ts';
import type { Witness } from '../reports.ts';
import type { Unfolded } from './unfold.ts';

/** Most observed bits of this road. */
export const DISTRIBUTION_BITS_MAX = 24;

/** Probability of each string of the bits (first = most significant). */
export function bitDistribution(
  { axes, data }: Unfolded,
  bits: readonly BitExpression[],
): Float64Array {
  const out = new Float64Array(2 ** bits.length);
  const rows = 2 ** axes;
  const readers = bits.map((bit) => {
    const shift = bit.kind === 'bit' ? axes - 1 - bit.bit : -1;
    if (shift >= 0) return (row: number): number => (row >>> shift) & 1;
    return (row: number): number =>
      evaluateBits(bit, (axis) => ((row >>> (axes - 1 - axis)) & 1) === 1) ? 1 : 0;
  });
  for (let row = 0; row < rows; row++) {
    const weight = data[row]! ** 2 + data[rows + row]! ** 2;
    if (weight === 0) continue;
    let key = 0;
    for (const read of readers) key = 2 * key + read(row);
    out[key]! += weight;
  }
  return out;
}

export function distributionDistance(p: Float64Array, q: Float64Array): number {
  let sum = 0;
  for (let m = 0; m < p.length; m++) sum += (Math.sqrt(p[m]!) - Math.sqrt(q[m]!)) ** 2;
  return sum / 2;
}

/** The string of bits whose probabilities differ most; `names` are those of the bits. */
export function likeliestDifference(
  p: Float64Array,
  q: Float64Array,
  names: readonly string[],
): Witness {
  let worst = 0;
  for (let m = 1; m < p.length; m++) {
    if (Math.abs(p[m]! - q[m]!) > Math.abs(p[worst]! - q[worst]!)) worst = m;
  }
  const text = names.map((name, k) => `${name}=${(worst >>> (names.length - 1 - k)) & 1}`);
  return {
    input: 'every wire in |0>',
    output: text.join(' '),
    probabilityOriginal: p[worst]!,
    probabilityRewritten: q[worst]!,
  };
}
