/**
 * Compares two circuits on a few random product inputs, where all inputs at once would be too large.
 *
 * Method: every `any` input is prepared in a random state of the sphere (Marsaglia's uniform direction by cos t uniform), in
 * both circuits alike; what is left is a comparison for inputs |0>, which needs half the bits. Product states span all
 * operators, so a difference shows on almost every one of them; but an error of size D on one probe may be smaller than D on
 * average over the space, so what is found the same is evidence, not proof.
 * Proves: a difference, with the input of the probe as its witness; never that two circuits are the same.
 */
import { type Circuit, gate, type Operation, wireName } from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { random } from '../numeric/random.ts';
import { entering, isAnnotated } from './annotations.ts';

export const PROBES = 8;

export type Probe = {
  original: Circuit;
  rewritten: Circuit;
  /** All inputs |0>: the preparation is part of the circuits. */
  contract: Contract;
  /** The input in words: angles of Ry, then Rz, on each wire. */
  input: string;
};

/** Both circuits with one random product input prepared in front. */
export function probeOf(
  original: Circuit,
  rewritten: Circuit,
  contract: Contract,
  seed: number,
  index: number,
): Probe {
  const draw = random(seed, 'probe', index);
  const angles = contract.inputs.map((rule): [number, number] | null =>
    rule === 'any' ? [Math.acos(1 - 2 * draw()), 2 * Math.PI * draw()] : null,
  );
  const shown = angles.flatMap((pair, wire) =>
    pair
      ? [`${wireName(original, wire)}=ry(${pair[0].toFixed(12)}) rz(${pair[1].toFixed(12)})|0>`]
      : [],
  );
  return {
    original: prepared(original, angles),
    rewritten: prepared(rewritten, angles),
    contract: { ...contract, inputs: contract.inputs.map(() => 'zero') },
    input: shown.join(' '),
  };
}

function prepared(circuit: Circuit, angles: readonly ([number, number] | null)[]): Circuit {
  const on = (wire: number, input: number): Operation[] => {
    const pair = angles[input];
    return pair ? [gate('ry', [wire], pair[0]), gate('rz', [wire], pair[1])] : [];
  };
  const first = isAnnotated(circuit) ? [] : angles.flatMap((_, wire) => (wire < circuit.wires ? on(wire, wire) : [])); // biome-ignore format: one choice
  const operations = circuit.operations.flatMap((operation): Operation[] => {
    if (operation.kind !== 'reset') return [operation];
    const input = entering(operation);
    return input < 0 ? [operation] : [operation, ...on(operation.wire, input)];
  });
  return { ...circuit, operations: [...first, ...operations] };
}
