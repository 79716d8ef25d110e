/**
 * Large circuits with planted openings: stretches of a long staircase of generic gates, each taken together as one matrix and
 * written anew in u3 and cx, so that every output of the stretch waits for all of its inputs, though the matrix says otherwise.
 *
 * A stretch on the places p .. p + m - 1 of the staircase is a chain of gates (p, p + 1), (p + 1, p + 2), .. of Haar unitaries.
 * With all stretches as chains the circuit needs two wires; each stretch on m wires that is not seen through needs m at once.
 */
import { type Circuit, emptyCircuit, type GateOperation, unitaryGate } from '../../src/circuit/circuit.ts'; // biome-ignore format: one import
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { nativeSetOf } from '../../src/native/native-set.ts';
import { shannonGates } from '../../src/native/shannon.ts';
import { toNative } from '../../src/native/to-native.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

export type Planted = { circuit: Circuit; openings: number; widest: number };

/** `sizes[k]`: wires of the k-th hidden stretch; between two of them lie plain gates. Wires are numbered in a random order. */
export function planted(wires: number, sizes: readonly number[], seed: number): Planted {
  const draw = random('planted', seed, wires);
  const names = Array.from({ length: wires }, (_, k) => k);
  for (let k = wires - 1; k > 0; k--) {
    const other = Math.floor((k + 1) * draw());
    [names[k], names[other]] = [names[other]!, names[k]!];
  }
  const steps = wires - 1;
  const hidden = sizes.reduce((sum, size) => sum + size - 1, 0);
  if (hidden > steps) throw new Error(`${hidden} hidden steps of a staircase of ${steps}`);
  let plain = steps - hidden;
  const operations: GateOperation[] = [];
  let place = 0;
  sizes.forEach((size, k) => {
    const before = Math.floor(plain / (sizes.length - k + 1));
    plain -= before;
    for (let step = 0; step < before; step++) operations.push(...stretch(2, place++));
    operations.push(...stretch(size, place));
    place += size - 1;
  });
  for (; place < steps; place++) operations.push(...stretch(2, place));
  return {
    circuit: { ...emptyCircuit(wires, 0, `planted ${wires}`), operations },
    openings: sizes.length,
    widest: Math.max(2, ...sizes),
  };

  function stretch(size: number, from: number): GateOperation[] {
    const chain = Array.from({ length: size - 1 }, (_, k) => unitaryGate(haarUnitary(4, draw), [k, k + 1])); // biome-ignore format: one list
    const whole = circuitUnitary({ ...emptyCircuit(size), operations: chain });
    const gates = toNative(shannonGates(whole, size), size, nativeSetOf('cx,u3', []));
    return gates.flatMap((g) => g.kind === 'gate' ? [{ ...g, wires: g.wires.map((k) => names[from + k]!) }] : []); // biome-ignore format: one list
  }
}
