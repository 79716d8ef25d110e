/**
 * Matches the registers of two circuits as the caller says: `a[0]=q[2], b=r` reads "a[0] of the original is q[2] of the other".
 *
 * Result: the rewritten circuit with its wires renumbered and its bits renamed, so that wires agree by number and bits by name,
 * which is what every road goes by. What is not mentioned keeps its order among what is left (wires), or its name and then
 * its order (bits). The wires of a narrowed circuit are matched by its annotations; only its bits can be mapped.
 * Fails: InputError for unknown names, sizes that differ, a wire and a bit, and for one thing named twice.
 */
import { bitName, type Circuit, moved, type Register, wireName } from '../circuit/circuit.ts';
import { InputError } from '../input-error.ts';
import { isAnnotated } from './annotations.ts';

export function matched(original: Circuit, rewritten: Circuit, map: string): Circuit {
  const wires = new Map<number, number>();
  const bits = new Map<number, number>();
  for (const part of map.split(',')) {
    const [left, right, ...more] = part.split('=').map((word) => word.trim());
    if (!left || !right || more.length > 0) throw problem(`expected NAME=NAME, as in a[0]=q[2], b=r, got ${part.trim()}`); // biome-ignore format: one message
    const [a, b] = [placeOf(left, original), placeOf(right, rewritten)];
    if (a.kind !== b.kind) throw problem(`expected two ${a.kind}s, got ${part.trim()}`);
    if (a.places.length !== b.places.length) {
      throw problem(`expected registers of one size, got ${left} with ${a.places.length} and ${right} with ${b.places.length}`); // biome-ignore format: one message
    }
    const pairs = a.kind === 'qubit' ? wires : bits;
    a.places.forEach((place, k) => {
      if (pairs.has(place)) throw problem(`named twice: ${left} of the original`);
      if ([...pairs.values()].includes(b.places[k]!)) throw problem(`named twice: ${right} of the rewritten circuit`); // biome-ignore format: one message
      pairs.set(place, b.places[k]!);
    });
  }
  if (wires.size > 0 && isAnnotated(rewritten)) {
    throw problem('expected bits only: the wires of a narrowed circuit are matched by its annotations'); // biome-ignore format: one message
  }
  return withBits(withWires(rewritten, wires), original, bits);
}

function problem(message: string): InputError {
  return new InputError({ code: 'bad-map', message: `${message} in --map` });
}

type Places = { kind: 'qubit' | 'bit'; places: number[] };

/** A register, or one of its elements. */
function placeOf(text: string, circuit: Circuit): Places {
  const [, name, index] = /^([A-Za-z_]\w*)(?:\[(\d+)\])?$/.exec(text) ?? [];
  for (const [kind, registers] of [
    ['qubit', circuit.qubitRegisters],
    ['bit', circuit.bitRegisters],
  ] as const) {
    const found = registers.find((register) => register.name === name);
    if (!found) continue;
    const { first, size } = found;
    if (index === undefined)
      return { kind, places: Array.from({ length: size }, (_, k) => first + k) };
    if (Number(index) >= size) throw problem(`index out of range: ${text} of ${circuit.name} has ${size} elements`); // biome-ignore format: one message
    return { kind, places: [first + Number(index)] };
  }
  throw problem(`unknown register ${text} of ${circuit.name}`);
}

function withWires(circuit: Circuit, pairs: ReadonlyMap<number, number>): Circuit {
  if (pairs.size === 0) return circuit;
  const taken = new Set(pairs.values());
  const rest = Array.from({ length: circuit.wires }, (_, wire) => wire).filter((wire) => !taken.has(wire)); // biome-ignore format: one list
  // the wire of the other circuit for each number from now on
  const from: number[] = [];
  for (let wire = 0; wire < circuit.wires; wire++) from.push(pairs.get(wire) ?? rest.shift() ?? -1);
  const to = new Map(from.map((wire, k) => [wire, k]));
  if (to.size < circuit.wires || to.has(-1)) {
    throw problem(`expected wires of the original below ${circuit.wires}, the number of the rewritten circuit's`); // biome-ignore format: one message
  }
  return {
    ...circuit,
    qubitRegisters: from.map((wire, k): Register => ({ name: wireName(circuit, wire), first: k, size: 1, scalar: true })), // biome-ignore format: one list
    operations: circuit.operations.map((operation) => moved(operation, (wire) => to.get(wire)!)), // every wire has a place
  };
}

function withBits(
  circuit: Circuit,
  original: Circuit,
  pairs: ReadonlyMap<number, number>,
): Circuit {
  if (pairs.size === 0) return circuit;
  const names = new Map<number, string>();
  for (const [own, other] of pairs) names.set(other, bitName(original, own));
  const used = new Set(names.values());
  const free = Array.from({ length: original.bits }, (_, bit) => bitName(original, bit)).filter((name) => !used.has(name)); // biome-ignore format: one list
  const rest = Array.from({ length: circuit.bits }, (_, bit) => bit).filter((bit) => !names.has(bit)); // biome-ignore format: one list
  for (const bit of rest) {
    const own = bitName(circuit, bit);
    if (free.includes(own)) {
      names.set(bit, own);
      free.splice(free.indexOf(own), 1);
    }
  }
  for (const bit of rest) if (!names.has(bit)) names.set(bit, free.shift() ?? `extra_${bit}`);
  const isHidden = (bit: number): boolean =>
    circuit.bitRegisters.some(({ first, size, hidden }) => hidden && bit >= first && bit < first + size); // biome-ignore format: one condition
  return {
    ...circuit,
    bitRegisters: Array.from({ length: circuit.bits }, (_, bit): Register => {
      const register = { name: names.get(bit)!, first: bit, size: 1, scalar: true }; // every bit was named above
      return isHidden(bit) ? { ...register, hidden: true } : register;
    }),
  };
}
