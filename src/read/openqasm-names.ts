/** What the names of an OpenQASM text stand for while it is read, and how operands find their wires and bits. */
import type { BitExpression, Operation, Register } from '../circuit/circuit.ts';
import { abandon, fail, halt, nearName, type Problems } from './openqasm-problems.ts';
import type { Parser } from './openqasm-statements.ts';
import type { GateDefinition, IndexPart, Named, Operand } from './openqasm-tree.ts';
import { type evaluate, evaluateInteger } from './openqasm-values.ts';

/** Limits, stated in the documentation of `readCircuit`. */
export const WIRES_MAX = 10_000;
export const BITS_MAX = 100_000;
/** Statements executed, operations made, their operands and the bits they read, all together. */
export const WORK_MAX = 2_500_000;
export const OPERATIONS_MAX = 500_000;
export const ITERATIONS_MAX = 1_000_000;

export type Value =
  | { kind: 'int' | 'float'; value: number }
  | { kind: 'bool'; value: boolean }
  /** Known only in the run; least significant bit first. */
  | { kind: 'bits'; bits: readonly BitExpression[]; scalar: boolean };

export type Meaning =
  | { kind: 'qubits'; places: readonly number[]; scalar: boolean }
  | { kind: 'bits'; places: readonly number[]; scalar: boolean }
  | { kind: 'value'; value: Value };

export type UserGate = {
  definition: GateDefinition & { at: number };
  /** Longest chain of definitions below it. */
  depth: number;
  /** Its definition was wrong: calls are not looked at. */
  broken: boolean;
  /** The gate of the table that it equals, if any. */
  sameAs: string | null;
};

export type Reader = {
  problems: Problems;
  parser: Parser;
  wires: number;
  bits: number;
  qubitRegisters: Register[];
  bitRegisters: Register[];
  /** Where operations go at the moment. */
  operations: Operation[];
  globalPhase: number;
  /** Innermost last. */
  scopes: Map<string, Meaning>[];
  gates: Map<string, UserGate>;
  /** Gates without a definition (2.0). */
  opaque: Set<string>;
  /** Gates of the 2.0 header beyond the table; a definition in the text replaces them. */
  fromHeader: Set<string>;
  /** The standard's gates are known: by `include`, or (after one report) as if. */
  included: boolean;
  work: number;
  made: number;
  heldBits: number;
  hasVersion: boolean;
};

/** Counts work done for the statement at `at`, and stops the reading when there is too much of it. */
export function spend(r: Reader, at: number, amount: number): void {
  r.work += amount;
  if (r.work > WORK_MAX) {
    const message = `the circuit is too long: more than ${WORK_MAX} operands and steps when written out`;
    halt(r.problems, at, message, 'is there a loop, a power or a gate that repeats too often?');
  }
}

export function emit(r: Reader, at: number, operation: Operation): void {
  r.operations.push(operation);
  if (++r.made > OPERATIONS_MAX) {
    const message = `the circuit is too long: more than ${OPERATIONS_MAX} operations when written out`;
    halt(r.problems, at, message, 'is there a loop, a power or a gate that repeats too often?');
  }
}

export function lookUp(r: Reader, name: string): Meaning | undefined {
  for (let k = r.scopes.length - 1; k >= 0; k--) {
    const meaning = r.scopes[k]!.get(name);
    if (meaning) return meaning;
  }
  return undefined;
}

/** Reports an unknown name once and remembers it as spoilt. */
export function failUnknown(r: Reader, at: number, what: string, name: string): never {
  if (r.parser.spoilt.has(name)) abandon();
  r.parser.spoilt.add(name);
  const known = r.scopes.flatMap((scope) => [...scope.keys()]);
  const near = nearName(name, known);
  const hint = near ? `did you mean ${near}?` : undefined;
  return fail(r.problems, at, 'unknown-name', `unknown ${what}: ${name}`, hint);
}

/** Enters a name into the innermost scope, unless it is taken there. */
export function declare(r: Reader, { name, at }: Named, meaning: Meaning): void {
  const scope = r.scopes[r.scopes.length - 1]!;
  if (CONSTANTS.has(name)) {
    fail(r.problems, at, 'already-declared', `${name} is a constant of the language`);
  }
  if (scope.has(name)) {
    fail(r.problems, at, 'already-declared', `already declared: ${name}`);
  }
  scope.set(name, meaning);
}

/** Wires or bits that an operand stands for; `scalar` when it is a single one and not a register of one. */
export type Places = { places: readonly number[]; scalar: boolean };

export function resolve(r: Reader, operand: Operand, kind: 'qubits' | 'bits'): Places {
  const meaning = lookUp(r, operand.name);
  const what = kind === 'qubits' ? 'qubit register' : 'bit register';
  if (!meaning) failUnknown(r, operand.at, what, operand.name);
  if (meaning.kind !== kind) {
    const is = { qubits: 'a qubit register', bits: 'a bit register', value: 'a constant' };
    const wanted = kind === 'qubits' ? 'a qubit' : 'a bit';
    const message = `expected ${wanted}, got ${operand.name}, which is ${is[meaning.kind]}`;
    fail(r.problems, operand.at, 'wrong-kind', message);
  }
  let places: Places = meaning;
  for (const part of operand.indices) places = choose(r, places, part, operand);
  return places;
}

function choose(r: Reader, { places, scalar }: Places, part: IndexPart, operand: Operand): Places {
  if (scalar) {
    const index = operand.indices.indexOf(part);
    const what = index === 0 ? operand.name : `${operand.name}[...]`;
    fail(r.problems, part.at, 'wrong-kind', `${what} is no register: it takes no index`);
  }
  const size = places.length;
  const pick = (value: number, at: number): number => {
    const index = value < 0 && r.parser.dialect === '3' ? value + size : value;
    if (index >= 0 && index < size) return places[index]!;
    const lowest = r.parser.dialect === '3' ? -size : 0;
    const message = `index of ${operand.name} must be in [${lowest}, ${size - 1}], got ${value}`;
    return fail(r.problems, at, 'index-out-of-range', message);
  };
  switch (part.kind) {
    case 'one': {
      const { value } = part;
      return { places: [pick(evaluateInteger(r, value, 'an index'), value.at)], scalar: true };
    }
    case 'set': {
      spend(r, part.at, part.items.length);
      const chosen = part.items.map((item) => pick(evaluateInteger(r, item, 'an index'), item.at));
      return { places: chosen, scalar: false };
    }
    case 'range': {
      const step = part.step ? evaluateInteger(r, part.step, 'a step') : 1;
      let first = part.first ? evaluateInteger(r, part.first, 'an index') : step > 0 ? 0 : size - 1;
      let last = part.last ? evaluateInteger(r, part.last, 'an index') : step > 0 ? size - 1 : 0;
      pick(first, part.first?.at ?? part.at);
      pick(last, part.last?.at ?? part.at);
      if (first < 0) first += size;
      if (last < 0) last += size;
      const count = rangeCount(r, part.at, first, step, last);
      spend(r, part.at, count);
      return {
        places: Array.from({ length: count }, (_, k) => places[first + k * step]!),
        scalar: false,
      };
    }
  }
}

function rangeCount(r: Reader, at: number, first: number, step: number, last: number): number {
  if (step === 0) fail(r.problems, at, 'wrong-range', 'the step of a range must not be 0');
  return Math.max(0, Math.floor((last - first) / step) + 1);
}

/** The values a loop runs through. */
export function* loopValues(r: Reader, part: IndexPart): Generator<number> {
  if (part.kind === 'set') {
    for (const item of part.items) yield evaluateInteger(r, item, 'a loop value');
    return;
  }
  if (part.kind === 'one' || !part.first || !part.last) {
    fail(r.problems, part.at, 'wrong-range', 'expected a range [a:b] or a set {a, b} to loop over');
  }
  const first = evaluateInteger(r, part.first, 'a loop bound');
  const last = evaluateInteger(r, part.last, 'a loop bound');
  const step = part.step ? evaluateInteger(r, part.step, 'a step') : 1;
  const count = rangeCount(r, part.at, first, step, last);
  if (count > ITERATIONS_MAX) {
    const message = `loops must have at most ${ITERATIONS_MAX} iterations, got ${count}`;
    halt(r.problems, part.at, message);
  }
  for (let k = 0; k < count; k++) yield first + k * step;
}

/** A hidden bit that keeps a value while the bits it came from are overwritten. */
export function holdBit(r: Reader, at: number): number {
  if (r.bits >= BITS_MAX) halt(r.problems, at, `${r.bits + 1} bits: ${BITS_MAX} is the limit here`);
  let name: string;
  do name = `held_${r.heldBits++}`;
  while (lookUp(r, name));
  const bit = addBits(r, name, 1, true);
  r.scopes[0]!.set(name, { kind: 'bits', places: [bit], scalar: true });
  return bit;
}

/** Adds a bit register; returns the number of its first bit. */
export function addBits(r: Reader, name: string, size: number, scalar: boolean): number {
  const first = r.bits;
  r.bitRegisters.push({ name, first, size, scalar });
  r.bits += size;
  return first;
}

/** A size in brackets, at least 1 and within the limit. */
export function sizeOf(
  r: Reader,
  size: Parameters<typeof evaluate>[1],
  taken: number,
  max: number,
  what: string,
): number {
  const value = evaluateInteger(r, size, 'the size of a register');
  if (value < 1) {
    fail(r.problems, size.at, 'wrong-size', `the size of a register must be >= 1, got ${value}`);
  }
  if (value + taken > max) {
    const message = `${value + taken} ${what}: ${max} is the limit here`;
    halt(r.problems, size.at, message);
  }
  return value;
}

/** Named constants of the language. */
export const CONSTANTS: ReadonlyMap<string, number> = new Map([
  ['pi', Math.PI],
  ['π', Math.PI],
  ['tau', 2 * Math.PI],
  ['τ', 2 * Math.PI],
  ['euler', Math.E],
  ['ℇ', Math.E],
]);
