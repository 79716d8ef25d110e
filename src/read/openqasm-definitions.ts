/**
 * Gate definitions: checks a body once and enters the gate.
 *
 * A definition that equals a gate of the table under the same name (compared as matrices at several generic
 * angles; its angles must be linear in the parameters, so that equal there means equal everywhere) stands
 * for that gate: a written circuit with its `gate` definitions reads back to the same operations.
 */
import { type GateEntry, gateTable } from '../circuit/gates.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import {
  barePiece,
  type Callee,
  checkAngleCount,
  checkWireCount,
  findCallee,
} from './openqasm-gates.ts';
import { pieceMatrix } from './openqasm-modifiers.ts';
import { CONSTANTS, failUnknown, lookUp, type Reader, type UserGate } from './openqasm-names.ts';
import { Abandoned, fail, nearName, report } from './openqasm-problems.ts';
import type { Expression, GateDefinition, Statement } from './openqasm-tree.ts';
import { evaluateInteger } from './openqasm-values.ts';

/** Definitions that call each other. */
export const DEFINITIONS_DEEP_MAX = 200;
/** Generic angles for comparing a definition with the table's gate; some far outside a turn. */
const SAMPLES = [0.7391, -1.2847, 2.6173, 17.4412, -9.8731];

/** Checks a definition and enters it. */
export function defineGate(r: Reader, definition: GateDefinition & { at: number }): void {
  const { name, at } = definition.name;
  const { dialect } = r.parser;
  const entry = gateTable.get(name);
  const isBuiltIn = name === 'U' || name === 'gphase' || (name === 'CX' && dialect === '2.0');
  const isIncluded = r.included && dialect === '3' && entry?.known.includes('3');
  if (r.gates.has(name) || isBuiltIn || isIncluded) {
    fail(r.problems, at, 'already-declared', `gate ${name} is already defined`);
  }
  const gate: UserGate = { definition, depth: 1, broken: true, sameAs: null };
  r.gates.set(name, gate);
  const before = r.problems.errors.length;
  const names = new Set<string>();
  for (const { name: part, at: place } of [...definition.parameters, ...definition.operands]) {
    if (names.has(part)) {
      report(r.problems, place, 'already-declared', `the gate has two parts named ${part}`);
    }
    names.add(part);
  }
  checkBody(r, gate, definition.body, new Set(definition.parameters.map((p) => p.name)));
  if (gate.depth > DEFINITIONS_DEEP_MAX) {
    const message = `gate definitions call each other more than ${DEFINITIONS_DEEP_MAX} deep`;
    fail(r.problems, at, 'too-deep', message);
  }
  gate.broken = r.problems.errors.length > before;
  if (!gate.broken && entry) gate.sameAs = equalsEntry(r, gate, entry) ? name : null;
}

function checkBody(
  r: Reader,
  gate: UserGate,
  body: readonly Statement[],
  values: ReadonlySet<string>,
): void {
  for (const statement of body) {
    try {
      checkBodyStatement(r, gate, statement, values);
    } catch (error) {
      if (!(error instanceof Abandoned)) throw error;
      gate.broken = true;
    }
  }
}

function checkBodyStatement(
  r: Reader,
  gate: UserGate,
  statement: Statement,
  values: ReadonlySet<string>,
): void {
  const { name, operands } = gate.definition;
  if (statement.kind === 'for') {
    checkBody(r, gate, statement.body, new Set([...values, statement.name.name]));
    return;
  }
  if (statement.kind !== 'call' && statement.kind !== 'barrier') {
    fail(
      r.problems,
      statement.at,
      'not-allowed',
      'only gates, barriers and for loops may stand in a gate body',
    );
  }
  const seen = new Set<string>();
  for (const operand of statement.operands) {
    if (operand.indices.length > 0) {
      const message = `${operand.name} is a single qubit of the gate: it takes no index`;
      fail(r.problems, operand.indices[0]!.at, 'wrong-kind', message);
    }
    if (!operands.some((known) => known.name === operand.name)) {
      const near = nearName(
        r.problems,
        operand.name,
        operands.map((known) => known.name),
      );
      const hint = near ? `did you mean ${near}?` : undefined;
      const message = `unknown qubit of gate ${name.name}: ${operand.name}`;
      fail(r.problems, operand.at, 'unknown-name', message, hint);
    }
    if (seen.has(operand.name)) {
      fail(r.problems, operand.at, 'duplicate-operand', 'a gate uses the same qubit twice');
    }
    seen.add(operand.name);
  }
  if (statement.kind === 'barrier') return;
  if (statement.name.name === name.name) {
    fail(r.problems, statement.name.at, 'recursive-gate', `gate ${name.name} must not call itself`);
  }
  const callee = findCallee(r, statement);
  if (callee.kind === 'user') gate.depth = Math.max(gate.depth, 1 + callee.gate.depth);
  checkAngleCount(r, statement, callee);
  // numbers of controls that depend on a loop are checked when the gate is used
  let controls = 0;
  for (const m of statement.modifiers) {
    if (m.kind !== 'control') continue;
    const isOpen = m.count !== null && mentions(m.count, values);
    controls += isOpen ? Number.NaN : m.count ? evaluateInteger(r, m.count, 'a number') : 1;
  }
  if (!Number.isNaN(controls)) checkWireCount(r, statement, callee, controls);
  for (const angle of statement.angles) checkNames(r, angle, values);
  for (const m of statement.modifiers) if (m.kind === 'power') checkNames(r, m.exponent, values);
}

/** Reports names in an expression that mean nothing. */
function checkNames(r: Reader, node: Expression, values: ReadonlySet<string>): void {
  for (const part of partsOf(node)) checkNames(r, part, values);
  if (node.kind !== 'operand') return;
  const { name } = node.operand;
  if (values.has(name) || CONSTANTS.has(name) || lookUp(r, name)) return;
  failUnknown(r, node.at, 'name', name);
}

function partsOf(node: Expression): Expression[] {
  switch (node.kind) {
    case 'unary':
      return [node.of];
    case 'power':
      return [node.base, node.exponent];
    case 'chain':
      return [node.first, ...node.rest.map(({ of }) => of)];
    case 'call':
      return node.arguments;
    default:
      return [];
  }
}

function mentions(node: Expression, values: ReadonlySet<string>): boolean {
  if (node.kind === 'operand') return values.has(node.operand.name);
  return partsOf(node).some((part) => mentions(part, values));
}

/** True for an expression that is a constant plus constant multiples of the parameters. */
function isLinear(node: Expression, values: ReadonlySet<string>): boolean {
  if (!mentions(node, values)) return true;
  if (node.kind === 'operand') return true;
  if (node.kind === 'unary') return /^[-+]$/.test(node.operator) && isLinear(node.of, values);
  if (node.kind !== 'chain') return false;
  const [operator] = node.rest.map((part) => part.operator);
  if (operator === '+' || operator === '-') return partsOf(node).every((p) => isLinear(p, values));
  if (operator !== '*' && operator !== '/') return false;
  const dependent = partsOf(node).filter((part) => mentions(part, values));
  const isDivisor = node.rest.some((part) => part.operator === '/' && mentions(part.of, values));
  return dependent.length === 1 && !isDivisor && isLinear(dependent[0]!, values);
}

function equalsEntry(r: Reader, gate: UserGate, entry: GateEntry): boolean {
  const { parameters, operands, body } = gate.definition;
  if (parameters.length !== entry.angles || operands.length !== entry.wires) return false;
  const values = new Set(parameters.map((p) => p.name));
  const isSimple = body.every(
    (s) => s.kind === 'call' && s.angles.every((angle) => isLinear(angle, values)),
  );
  if (!isSimple || body.length > 200) return false;
  const wires = operands.map((_, k) => k);
  const callee: Callee = { kind: 'user', gate, name: entry.name, wires: wires.length, angles: 0 };
  const rounds = entry.angles === 0 ? 1 : SAMPLES.length;
  for (let round = 0; round < rounds; round++) {
    const angles = parameters.map((_, k) => SAMPLES[(round + 2 * k) % SAMPLES.length]! + 0.1 * k);
    const piece = barePiece(r, gate.definition.at, callee, angles, wires);
    if (piece.operations.length > 200) return false;
    const matrix = pieceMatrix(piece, wires.length);
    const target = entry.matrix(angles);
    const isSame =
      r.parser.dialect === '2.0'
        ? hilbertSchmidtDistance(matrix, target).distance < 1e-20
        : matrix.every((x, k) => Math.abs(x - target[k]!) < 1e-10);
    if (!isSame) return false;
  }
  return true;
}
