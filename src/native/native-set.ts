/**
 * Says what a machine can do itself: a set of single-wire gates and one entangler.
 *
 * A set is written as a list, `cx,rz,sx`: one two-wire gate of the gate table (or a name given by the caller with its
 * own 4 x 4 unitary) and the single-wire gates of one of `ONE_WIRE_SETS`, in any order.
 * Fails: InputError that names the unknown or missing part.
 */
import { gateTable } from '../circuit/gates.ts';
import { InputError, nearestWord } from '../input-error.ts';
import type { Entangler } from '../reshape/template.ts';
import { ONE_WIRE_SETS, type OneWireSet } from './euler.ts';

export type NativeSet = {
  /** The list, normalised: entangler first. */
  text: string;
  oneWire: OneWireSet;
  entangler: Entangler;
};

/** An entangler of the caller's own: planar 4 x 4, unitary. */
export type CustomEntangler = { name: string; matrix: Float64Array };

/** Single-wire gates a set may name, in the order of `ONE_WIRE_SETS`. */
const ONE_WIRE_NAMES = new Set(ONE_WIRE_SETS.flatMap((set) => set.split(',')));

export function nativeSetOf(list: string, custom: readonly CustomEntangler[] = []): NativeSet {
  const names = list
    .split(',')
    .map((name) => name.trim())
    .filter((name) => name !== '');
  const own = new Map(custom.map(({ name, matrix }) => [name, matrix]));
  const oneWireNames: string[] = [];
  const entanglers: string[] = [];
  for (const name of names) {
    if (ONE_WIRE_NAMES.has(name)) oneWireNames.push(name);
    else if (own.has(name) || gateTable.get(name)?.wires === 2) entanglers.push(name);
    else throw unknownGate(name);
  }
  const [entangler] = entanglers;
  if (entangler === undefined || entanglers.length !== 1) {
    throw new InputError({
      code: 'native-set',
      message: `expected exactly one two-wire gate in the native set, got ${entanglers.length} in ${list}`,
      hint: 'for example: cx,rz,sx',
    });
  }
  const wanted = [...new Set(oneWireNames)].sort().join();
  const oneWire = ONE_WIRE_SETS.find((set) => set.split(',').sort().join() === wanted);
  if (!oneWire) {
    throw new InputError({
      code: 'native-set',
      message: `expected single-wire gates from one of the sets known, got ${oneWireNames.join() || 'none'}`,
      hint: `known sets: ${ONE_WIRE_SETS.join('; ')}`,
    });
  }
  const matrix = own.get(entangler);
  const angles = matrix ? 0 : (gateTable.get(entangler)?.angles ?? 0);
  if (angles > 1) {
    throw new InputError({
      code: 'native-set',
      message: `expected a two-wire gate with at most one angle, got ${entangler} with ${angles}`,
    });
  }
  return {
    text: `${entangler},${oneWire}`,
    oneWire,
    entangler: {
      name: entangler,
      ...(matrix ? { matrix } : {}),
      ...(angles === 1 ? { angle: 'free' as const } : {}),
    },
  };
}

function unknownGate(name: string): InputError {
  const known = [...ONE_WIRE_NAMES];
  for (const { name: gate, wires } of gateTable.values()) if (wires === 2) known.push(gate);
  const near = nearestWord(name, known);
  return new InputError({
    code: 'unknown-gate',
    message: `unknown gate in the native set: ${name}`,
    ...(near ? { hint: `did you mean ${near}?` } : {}),
  });
}
