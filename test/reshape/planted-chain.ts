import { applyMatrixInto } from '../../src/circuit/unitary.ts';
import { identity } from '../../src/numeric/complex-matrix.ts';
import { nearestUnitary } from '../../src/numeric/nearest-unitary.ts';
import { normal, type Random, random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

export type Planted = { u: Float64Array; inputs: number[]; outputs: number[] };

/** A chain of Haar blocks of `width` wires down a staircase of n wires, its inputs and outputs shuffled. */
export function plantedChain(n: number, width: number, seed: number): Planted {
  const draw = random(seed, 'planted', n, width);
  const d = 2 ** n;
  const plain = identity(d);
  for (let first = 0; first + width <= n; first++) {
    const wires = Array.from({ length: width }, (_, k) => first + k);
    applyMatrixInto(plain, haarUnitary(2 ** width, draw), wires, n, d);
  }
  const inputs = shuffled(n, draw);
  const outputs = shuffled(n, draw);
  // u takes input k where the plain chain takes inputs[k], and gives output k where it gives outputs[k]
  const index = (permutation: readonly number[], state: number): number =>
    permutation.reduce((sum, place, k) => {
      const bit = (state >> (n - 1 - k)) & 1;
      return sum + bit * 2 ** (n - 1 - place);
    }, 0);
  const u = new Float64Array(2 * d * d);
  for (let r = 0; r < d; r++) {
    for (let c = 0; c < d; c++) {
      const from = index(outputs, r) * d + index(inputs, c);
      u[r * d + c] = plain[from]!;
      u[d * d + r * d + c] = plain[d * d + from]!;
    }
  }
  return { u, inputs, outputs };
}

export function shuffled(n: number, draw: Random): number[] {
  const list = Array.from({ length: n }, (_, k) => k);
  for (let k = n - 1; k > 0; k--) {
    const other = Math.floor(draw() * (k + 1));
    [list[k], list[other]] = [list[other]!, list[k]!];
  }
  return list;
}

/** The unitary nearest to u with Gaussian noise of that size on every entry. */
export function perturbed(u: Float64Array, d: number, size: number, seed: number): Float64Array {
  const draw = random(seed, 'noise');
  return nearestUnitary(
    u.map((x) => x + (size * normal(draw)) / Math.sqrt(d)),
    d,
  );
}
