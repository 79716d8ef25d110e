/**
 * Says what is looked at when two circuits are compared: inputs and outputs by the wires of the original, its bits,
 * and where each of them is in the other circuit.
 */
import {
  type BitExpression,
  bitName,
  type Circuit,
  visibleBits,
  wireName,
} from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';
import { InputError } from '../input-error.ts';
import type { Unfolded } from './unfold.ts';

/** What is observed of both circuits, in the terms of the original. */
/** Which bit of the rewritten circuit stands for each bit of the original that somebody can see. */
export function bitPairs(
  original: Circuit,
  rewritten: Circuit,
): { original: number; rewritten: number }[] {
  const partner = matchBits(original, rewritten);
  return visibleBits(original).map((bit, k) => ({ original: bit, rewritten: partner[k]! }));
}

export type Observation = {
  names: { inputs: string[]; outputs: string[]; bits: string[]; hasZeroInputs: boolean };
  kept: readonly number[];
  of(
    unfolded: Unfolded,
    side: 'original' | 'rewritten',
    relabelling?: readonly number[] | null,
  ): { keptAxes: number[]; bits: BitExpression[]; anyInputs: number[] };
};

/** Matches the two circuits' wires and bits under the contract. */
export function observation(
  original: Circuit,
  rewritten: Circuit,
  contract: Contract,
): Observation {
  const wires = contract.inputs.map((_, wire) => wire);
  const anyInputs = wires.filter((wire) => contract.inputs[wire] === 'any');
  const kept = wires.filter((wire) => contract.outputs[wire] === 'kept');
  const virtual = unwrittenOutputs(original, contract);
  const visible = visibleBits(original);
  const partner = matchBits(original, rewritten);
  const names = {
    inputs: anyInputs.map((wire) => wireName(original, wire)),
    outputs: kept.map((wire) => wireName(original, wire)),
    bits: [
      ...visible.map((bit) => bitName(original, bit)),
      ...virtual.map((wire) => wireName(original, wire)),
    ],
    hasZeroInputs: anyInputs.length < wires.length,
  };
  return {
    names,
    kept,
    of: (unfolded, side, relabelling) => {
      const place = (wire: number): number => unfolded.outputAxis[relabelling?.[wire] ?? wire]!;
      const own = (side === 'original' ? visible : partner).map((bit) => unfolded.bits[bit]!);
      const missing = virtual.find((wire) => place(wire) < 0);
      if (missing !== undefined) {
        throw new InputError({
          code: 'missing-output',
          message: `missing output ${wireName(original, missing)} in the rewritten circuit`,
          file: rewritten.name,
        });
      }
      const extra = virtual.map((wire): BitExpression => ({ kind: 'bit', bit: place(wire) }));
      return { keptAxes: kept.map(place), bits: [...own, ...extra], anyInputs };
    },
  };
}

/** Outputs that the contract measures and the original does not write into a bit: they are seen by themselves. */
export function unwrittenOutputs(original: Circuit, { outputs }: Contract): number[] {
  const intoBits = measuredWires(original);
  return outputs.flatMap((rule, wire) =>
    rule === 'measured' && !intoBits.has(wire) ? [wire] : [],
  );
}

/** Wires whose last operation is a measurement into a bit. */
function measuredWires(circuit: Circuit): Set<number> {
  const found = new Set<number>();
  for (const operation of circuit.operations) {
    if (operation.kind === 'measure' && operation.bit >= 0) found.add(operation.wire);
    else if (operation.kind === 'measure' || operation.kind === 'reset')
      found.delete(operation.wire);
    else if (operation.kind === 'gate') for (const wire of operation.wires) found.delete(wire);
  }
  return found;
}

/**
 * For every bit of the original that is an output the bit of the rewritten circuit: of the same name, else of the
 * same number among those.
 */
function matchBits(original: Circuit, rewritten: Circuit): number[] {
  const others = visibleBits(rewritten);
  const byName = new Map(others.map((bit) => [bitName(rewritten, bit), bit]));
  const names = visibleBits(original).map((bit) => bitName(original, bit));
  const isByName = names.some((name) => byName.has(name));
  return names.map((name, index) => {
    const found = isByName ? byName.get(name) : others[index];
    if (found === undefined) {
      throw new InputError({
        code: 'missing-bit',
        message: `missing bit ${name} of the original in the rewritten circuit`,
        file: rewritten.name,
      });
    }
    return found;
  });
}
