/**
 * Finds which gates a written circuit must define itself, under which names and with which bodies.
 */
import type { Circuit, GateBody, GateOperation } from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';
import { InputError } from '../input-error.ts';
import { definitionOf } from './gate-definitions.ts';
import { angleText } from './numbers.ts';

export type Definitions = {
  /** `gate ... { ... }`, each before its first use. */
  lines: string[];
  /** The name under which an operation's base gate is called. */
  nameOf(operation: GateOperation): string;
};

type GateText = (
  definitions: Definitions,
  operation: GateOperation,
  operands: readonly string[],
  language: '2.0' | '3',
) => string;

type State = {
  language: '2.0' | '3';
  bodies: ReadonlyMap<string, GateBody>;
  gateText: GateText;
  lines: string[];
  /** Names that are taken: of registers, of the standard, of what is defined already. */
  taken: Set<string>;
  defined: Set<string>;
  /** Gates by matrix: name by the matrix itself, and by label for comparing contents. */
  named: Map<Float64Array, string>;
  byLabel: Map<string, { matrix: Float64Array; name: string }[]>;
};

export function definitionsOf(
  circuit: Circuit,
  language: '2.0' | '3',
  bodies: ReadonlyMap<string, GateBody>,
  gateText: GateText,
): Definitions {
  const registers = [...circuit.qubitRegisters, ...circuit.bitRegisters].map(({ name }) => name);
  const state: State = {
    language,
    bodies,
    gateText,
    lines: [],
    taken: new Set([...registers, ...gateTable.keys(), 'gphase', 'u0', 'rc3x']),
    defined: new Set(),
    named: new Map(),
    byLabel: new Map(),
  };
  const definitions: Definitions = {
    lines: state.lines,
    nameOf: (operation) => (operation.matrix ? state.named.get(operation.matrix)! : operation.name),
  };
  for (const operation of circuit.operations) {
    if (operation.kind === 'gate') define(state, definitions, operation);
  }
  return definitions;
}

/** Makes sure that the base gate of an operation may be called. */
function define(state: State, definitions: Definitions, operation: GateOperation): void {
  if (operation.matrix) {
    defineMatrix(state, definitions, operation, operation.matrix);
    return;
  }
  const { name, line, column } = operation;
  if (state.defined.has(name)) return;
  state.defined.add(name);
  const entry = gateTable.get(name);
  if (!entry) {
    throw new InputError({
      code: 'unknown-gate',
      message: `unknown gate: ${name}`,
      ...(line === undefined ? {} : { line }),
      ...(column === undefined ? {} : { column }),
    });
  }
  if (entry.known.includes(state.language)) return;
  const text = definitionOf(name, state.language);
  if (!text) {
    const message = `OpenQASM ${state.language} cannot say gate ${name}`;
    throw new InputError({ code: 'not-in-2.0', message, hint: 'write OpenQASM 3 instead' });
  }
  state.lines.push(`gate ${text.head} { ${text.body} }`);
}

function defineMatrix(
  state: State,
  definitions: Definitions,
  operation: GateOperation,
  matrix: Float64Array,
): void {
  if (state.named.has(matrix)) return;
  const label = operation.label ?? 'unitary';
  const peers = state.byLabel.get(label) ?? [];
  state.byLabel.set(label, peers);
  const same = peers.find((peer) => sameNumbers(peer.matrix, matrix));
  if (same) {
    state.named.set(matrix, same.name);
    return;
  }
  const wires = operation.wires.length - operation.controls.length;
  const body = operation.definition ?? state.bodies.get(label) ?? oneWireBody(matrix, wires);
  if (!body) {
    const message = `gate ${label} on ${wires} wires is known by its matrix only and cannot be written`;
    const hint = 'build native gates for it first';
    throw new InputError({ code: 'no-definition', message, hint });
  }
  for (const inner of body.operations) define(state, definitions, inner);
  const name = freeName(state, label);
  state.named.set(matrix, name);
  peers.push({ matrix, name });
  state.lines.push(...bodyLines(state, definitions, name, wires, body));
}

function bodyLines(
  state: State,
  definitions: Definitions,
  name: string,
  wires: number,
  body: GateBody,
): string[] {
  const { language } = state;
  const operands = Array.from({ length: wires }, (_, k) => `w${k}`);
  const lines = [`gate ${name} ${operands.join(language === '3' ? ', ' : ',')} {`];
  if (body.phase !== 0 && language === '3') lines.push(`  gphase(${angleText(body.phase)});`);
  for (const inner of body.operations) {
    const names = inner.wires.map((wire) => operands[wire]!);
    lines.push(`  ${state.gateText(definitions, inner, names, language)}`);
  }
  lines.push('}');
  return lines;
}

function sameNumbers(a: Float64Array, b: Float64Array): boolean {
  return a.length === b.length && a.every((x, k) => x === b[k]);
}

function freeName(state: State, label: string): string {
  const stem = label.replaceAll(/[^A-Za-z0-9_]+/g, '_').replace(/^[^a-z]/, (c) => `g${c}`) || 'g';
  let name = stem;
  for (let k = 2; state.taken.has(name); k++) name = `${stem}_${k}`;
  state.taken.add(name);
  return name;
}

/** U(t, f, l) and a phase for a matrix on one wire: m = e^{ig} [[c, -e^{il} s], [e^{if} s, e^{i(f+l)} c]]. */
function oneWireBody(m: Float64Array, wires: number): GateBody | undefined {
  if (wires !== 1) return undefined;
  const size = (k: number): number => Math.hypot(m[k]!, m[4 + k]!);
  const argument = (k: number, sign: 1 | -1 = 1): number =>
    Math.atan2(sign * m[4 + k]!, sign * m[k]!);
  const t = 2 * Math.atan2(size(2), size(0));
  // without a diagonal only two phases exist, without an off-diagonal likewise: the third angle is then 0
  const isAnti = size(0) < 1e-15;
  const g = isAnti ? argument(1, -1) : argument(0);
  const l = isAnti ? 0 : size(1) < 1e-15 ? 0 : argument(1, -1) - g;
  const f = size(2) < 1e-15 ? argument(3) - g : argument(2) - g;
  const operation: GateOperation = {
    kind: 'gate',
    name: 'U',
    angles: [t, f, l],
    wires: [0],
    controls: [],
    power: 1,
  };
  // U of the language carries a factor e^{it/2} of its own
  return { operations: [operation], phase: g - t / 2 };
}
