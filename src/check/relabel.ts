/**
 * Finds which output of the rewritten circuit is which output of the original.
 *
 * Method: every kept output gets a fingerprint, its Bloch vector for a few random product inputs (seeded). Outputs of
 * equal fingerprints are matched; where several agree, every consistent assignment is tried with the full distance,
 * up to `ASSIGNMENTS_MAX`. So permutations are found, not enumerated: the cost is a few state evolutions.
 * Result: relabelling[k] = output of the rewritten circuit that carries output k; null when no assignment fits.
 */
import { random } from '../numeric/random.ts';
import { channelDistance } from './channel-distance.ts';
import type { Observation } from './observation.ts';
import { type Observed, observe } from './observed.ts';
import type { Unfolded } from './unfold.ts';

const INPUTS = 4;
const ASSIGNMENTS_MAX = 5000;

export function findRelabelling(
  a: Unfolded,
  b: Unfolded,
  plan: Observation,
  left: Observed,
  name: string,
  seed: number,
): number[] | null {
  const right = observe(b, plan.of(b, 'rewritten'), name);
  const outputs = plan.kept;
  const size = 2 ** plan.names.inputs.length;
  const one = fingerprints(left, outputs.length, size, seed);
  const two = fingerprints(right, outputs.length, size, seed);
  const choices = one.map((print) =>
    two.flatMap((other, k) => (gap(print, other) < 1e-6 ? [k] : [])),
  );
  const whole = Array.from({ length: a.outputAxis.length }, (_, k) => k);
  let best: { relabelling: number[]; distance: number } | null = null;
  let tried = 0;
  const assign = (k: number, used: readonly number[]): void => {
    if (tried >= ASSIGNMENTS_MAX || (best && best.distance < 1e-20)) return;
    if (k === outputs.length) {
      tried++;
      const relabelling = whole.slice();
      used.forEach((other, at) => {
        relabelling[outputs[at]!] = outputs[other]!;
      });
      const seen = observe(b, plan.of(b, 'rewritten', relabelling), name);
      const { hilbertSchmidt } = channelDistance(left, seen, 1);
      if (!best || hilbertSchmidt < best.distance) best = { relabelling, distance: hilbertSchmidt };
      return;
    }
    for (const other of choices[k]!) if (!used.includes(other)) assign(k + 1, [...used, other]);
  };
  assign(0, []);
  // assigned inside the closure above
  return (best as { relabelling: number[] } | null)?.relabelling ?? null;
}

function gap(a: readonly number[], b: readonly number[]): number {
  return a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);
}

/** Bloch vectors of each kept output (bits ignored) for the random inputs, one list per output. */
function fingerprints(observed: Observed, kept: number, size: number, seed: number): number[][] {
  const out: number[][] = Array.from({ length: kept }, () => []);
  const k = observed.rows / size;
  for (let input = 0; input < INPUTS; input++) {
    const draw = random(seed, 'relabel', input);
    const [re, im] = [new Float64Array(size), new Float64Array(size)];
    re[0] = 1;
    for (let block = 1; block < size; block *= 2) {
      // one more wire in a random state cos, e^{if} sin
      const [t, f] = [Math.acos(1 - 2 * draw()) / 2, 2 * Math.PI * draw()];
      for (let s = block - 1; s >= 0; s--) {
        const [x, y] = [re[s]!, im[s]!];
        const [cr, ci] = [Math.sin(t) * Math.cos(f), Math.sin(t) * Math.sin(f)];
        re[s + block] = x * cr - y * ci;
        im[s + block] = x * ci + y * cr;
        re[s] = Math.cos(t) * x;
        im[s] = Math.cos(t) * y;
      }
    }
    const bloch = new Float64Array(3 * kept);
    for (const { matrix, columns } of observed.outcomes.values()) {
      const half = observed.rows * columns;
      for (let e = 0; e < columns; e++) {
        const [sr, si] = [new Float64Array(k), new Float64Array(k)];
        for (let row = 0; row < k; row++) {
          for (let s = 0; s < size; s++) {
            const at = (row * size + s) * columns + e;
            const [x, y] = [matrix[at]!, matrix[half + at]!];
            sr[row]! += x * re[s]! - y * im[s]!;
            si[row]! += x * im[s]! + y * re[s]!;
          }
        }
        addBloch(bloch, sr, si, kept);
      }
    }
    for (let w = 0; w < kept; w++) out[w]!.push(...bloch.subarray(3 * w, 3 * w + 3));
  }
  return out;
}

function addBloch(bloch: Float64Array, re: Float64Array, im: Float64Array, kept: number): void {
  for (let w = 0; w < kept; w++) {
    const stride = 2 ** (kept - 1 - w);
    for (let row = 0; row < re.length; row++) {
      if (row & stride) continue;
      const [a, b, c, d] = [re[row]!, im[row]!, re[row + stride]!, im[row + stride]!];
      bloch[3 * w]! += 2 * (a * c + b * d);
      bloch[3 * w + 1]! += 2 * (a * d - b * c);
      bloch[3 * w + 2]! += a * a + b * b - c * c - d * d;
    }
  }
}
