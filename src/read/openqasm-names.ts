/** The state of a reading: what names stand for, what has been made, and how much work was done for it. */
import type { BitExpression, Operation, Register } from '../circuit/circuit.ts';
import type { Parser } from './openqasm-parser.ts';
import { abandon, fail, halt, nearName, type Problems } from './openqasm-problems.ts';
import type { GateDefinition, Named } from './openqasm-tree.ts';

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
  /** The quotient of integers is a fraction: in the exponents of `pow`. */
  realDivision: boolean;
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

function* namesIn(scopes: readonly Map<string, Meaning>[]): Generator<string> {
  for (let k = scopes.length - 1; k >= 0; k--) yield* scopes[k]!.keys();
}

/** Reports an unknown name once and remembers it as spoilt. */
export function failUnknown(r: Reader, at: number, what: string, name: string): never {
  if (r.parser.spoilt.has(name)) abandon();
  r.parser.spoilt.add(name);
  const near = nearName(r.problems, name, namesIn(r.scopes));
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

/** A hidden bit that keeps a value while the bits it came from are overwritten. */
export function holdBit(r: Reader, at: number): number {
  if (r.bits >= BITS_MAX) halt(r.problems, at, `${r.bits + 1} bits: ${BITS_MAX} is the limit here`);
  let name: string;
  do name = `held_${r.heldBits++}`;
  while (lookUp(r, name));
  const bit = addBits(r, name, 1, true, true);
  r.scopes[0]!.set(name, { kind: 'bits', places: [bit], scalar: true });
  return bit;
}

/** Adds a bit register; returns the number of its first bit. */
export function addBits(
  r: Reader,
  name: string,
  size: number,
  scalar: boolean,
  isHidden = false,
): number {
  const first = r.bits;
  r.bitRegisters.push({ name, first, size, scalar, ...(isHidden ? { hidden: true } : {}) });
  r.bits += size;
  return first;
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
