/** Gate calls: finds the gate, checks the operands, broadcasts, and writes the call out in gates of the table. */
import type { GateOperation } from '../circuit/circuit.ts';
import { type GateEntry, gateTable } from '../circuit/gates.ts';
import {
  controlPiece,
  foldControls,
  invertPiece,
  type Piece,
  powerPiece,
} from './openqasm-modifiers.ts';
import {
  emit,
  lookUp,
  type Meaning,
  type Reader,
  spend,
  type UserGate,
  type Value,
} from './openqasm-names.ts';
import { abandon, fail, nearName, report, warn } from './openqasm-problems.ts';
import type { GateCall, Statement } from './openqasm-tree.ts';
import { evaluateInteger, evaluateReal, loopValues, resolve } from './openqasm-values.ts';

const NO_ANGLES: readonly number[] = Object.freeze([]);
const NO_CONTROLS: readonly boolean[] = Object.freeze([]);

export type Callee = { name: string; wires: number; angles: number } & (
  | { kind: 'table'; entry: GateEntry }
  | { kind: 'user'; gate: UserGate }
  | { kind: 'phase' }
);

/** What a call's name stands for; reports an unknown name. */
export function findCallee(r: Reader, call: { name: { name: string; at: number } }): Callee {
  const { name, at } = call.name;
  const user = r.gates.get(name);
  if (user) {
    if (user.broken) abandon();
    const { operands, parameters } = user.definition;
    const entry = user.sameAs ? gateTable.get(user.sameAs) : undefined;
    const counts = { name, wires: operands.length, angles: parameters.length };
    return entry ? { kind: 'table', entry, ...counts } : { kind: 'user', gate: user, ...counts };
  }
  const { dialect, spoilt } = r.parser;
  if (name === 'gphase' && dialect === '3') return { kind: 'phase', name, wires: 0, angles: 1 };
  if (spoilt.has(name)) abandon();
  const entry = gateTable.get(name);
  const isKnown = entry?.known.includes(dialect);
  const isBuiltIn = name === 'U' || (name === 'CX' && dialect === '2.0');
  if (entry && isKnown && !isBuiltIn && !r.included) {
    const file = dialect === '3' ? 'stdgates.inc' : 'qelib1.inc';
    const hint = `add include "${file}"; before the first gate`;
    report(
      r.problems,
      at,
      'missing-include',
      `gate ${name} is used without the standard's gates`,
      hint,
    );
    r.included = true;
  }
  if (entry && isKnown) {
    if (name === 'cu3') warnOfCu3(r, at);
    return { kind: 'table', entry, name, wires: entry.wires, angles: entry.angles };
  }
  return failUnknownGate(r, name, at, entry);
}

/** The paper's cu3 and that of later copies of the header differ by a phase on the control. */
function warnOfCu3(r: Reader, at: number): void {
  if (r.problems.seen.has('cu3')) return;
  r.problems.seen.add('cu3');
  const message =
    'cu3 is read as in the header of the OpenQASM 2.0 paper: later copies add a phase (phi+lambda)/2 on the control';
  warn(r.problems, at, 'two-meanings', message);
}

/** The gates that a text may call: those of the standard, then its own. */
function* gateNames(r: Reader): Generator<string> {
  for (const { name, known } of gateTable.values()) {
    if (known.includes(r.parser.dialect)) yield name;
  }
  yield* r.gates.keys();
}

function failUnknownGate(r: Reader, name: string, at: number, entry?: GateEntry): never {
  const meaning = lookUp(r, name);
  if (meaning)
    fail(
      r.problems,
      at,
      'wrong-kind',
      `expected a gate, got ${name}, which is a register or a constant`,
    );
  const { dialect } = r.parser;
  if (entry) {
    const where = dialect === '3' ? 'stdgates.inc of OpenQASM 3' : 'the header of OpenQASM 2.0';
    fail(
      r.problems,
      at,
      'unknown-gate',
      `unknown gate: ${name}`,
      `${where} lacks it: define it with gate ${name} ... { ... }`,
    );
  }
  const near = nearName(r.problems, name, gateNames(r));
  const hint = near ? `did you mean ${near}?` : undefined;
  return fail(r.problems, at, 'unknown-gate', `unknown gate: ${name}`, hint);
}

export function checkAngleCount(r: Reader, call: GateCall, callee: Callee): void {
  const got = call.angles.length;
  if (got === callee.angles) return;
  const message = `gate ${callee.name} takes ${plural(callee.angles, 'angle')}, got ${got}`;
  fail(r.problems, call.name.at, 'wrong-count', message);
}

export function checkWireCount(r: Reader, call: GateCall, callee: Callee, controls: number): void {
  const got = call.operands.length;
  if (got === callee.wires + controls) return;
  const withControls = controls > 0 ? ` and ${plural(controls, 'control')}` : '';
  const message = `gate ${callee.name} takes ${plural(callee.wires, 'qubit')}${withControls}, got ${got}`;
  fail(r.problems, call.name.at, 'wrong-count', message);
}

const plural = (n: number, noun: string): string => `${n} ${noun}${n === 1 ? '' : 's'}`;

type Modification = { at: number } & (
  | { kind: 'controls'; positive: boolean; count: number }
  | { kind: 'inverse' }
  | { kind: 'power'; exponent: number }
);

/** Modifiers with their numbers, outermost first. */
function modificationsOf(r: Reader, call: GateCall): Modification[] {
  return call.modifiers.map((modifier): Modification => {
    const { at } = modifier;
    if (modifier.kind === 'inverse') return { kind: 'inverse', at };
    if (modifier.kind === 'power') {
      // the standard's own library writes pow(1/2) for a square root: fractions are real here
      r.realDivision = true;
      try {
        return { kind: 'power', at, exponent: evaluateReal(r, modifier.exponent, 'an exponent') };
      } finally {
        r.realDivision = false;
      }
    }
    const { count: node, positive } = modifier;
    const count = node ? evaluateInteger(r, node, 'a number of controls') : 1;
    if (node && count < 1) {
      fail(r.problems, node.at, 'wrong-count', `the number of controls must be >= 1, got ${count}`);
    }
    return { kind: 'controls', at, positive, count };
  });
}

function controlCount(modifications: readonly Modification[]): number {
  return modifications.reduce((sum, m) => sum + (m.kind === 'controls' ? m.count : 0), 0);
}

/** The gates of a call on wires already found: first the controls, then the gate's own. */
function callPiece(
  r: Reader,
  at: number,
  callee: Callee,
  angles: readonly number[],
  modifications: readonly Modification[],
  wires: readonly number[],
): Piece {
  let first = controlCount(modifications);
  let piece = barePiece(r, at, callee, angles, first === 0 ? wires : wires.slice(first));
  for (let k = modifications.length - 1; k >= 0; k--) {
    const m = modifications[k]!;
    if (m.kind === 'inverse') piece = invertPiece(r, m.at, piece);
    else if (m.kind === 'power') {
      piece = powerPiece(r, m.at, piece, m.exponent, wires.slice(first), callee.name);
    } else {
      for (let c = 0; c < m.count; c++) {
        piece = controlPiece(r, m.at, piece, wires[--first]!, m.positive);
      }
    }
  }
  return piece;
}

export function barePiece(
  r: Reader,
  at: number,
  callee: Callee,
  angles: readonly number[],
  wires: readonly number[],
): Piece {
  spend(r, at, 1 + wires.length);
  if (callee.kind === 'phase') return { operations: [], phase: angles[0]! };
  if (callee.kind === 'table') {
    return { operations: [tableGate(callee.entry.name, angles, wires)], phase: 0 };
  }
  const { definition } = callee.gate;
  const names = new Map<string, Meaning>();
  definition.parameters.forEach(({ name }, k) => {
    names.set(name, { kind: 'value', value: { kind: 'float', value: angles[k]! } });
  });
  const places = new Map(definition.operands.map(({ name }, k) => [name, wires[k]!]));
  // the body sees global constants and its own parameters, not what surrounds the call
  const { scopes } = r;
  r.scopes = [scopes[0]!, names];
  const piece: Piece = { operations: [], phase: 0 };
  expandBody(r, definition.body, places, piece);
  r.scopes = scopes;
  return piece;
}

function tableGate(
  name: string,
  angles: readonly number[],
  wires: readonly number[],
): GateOperation {
  return { kind: 'gate', name, angles, wires, controls: NO_CONTROLS, power: 1 };
}

function expandBody(
  r: Reader,
  body: readonly Statement[],
  places: ReadonlyMap<string, number>,
  piece: Piece,
): void {
  for (const statement of body) {
    if (statement.kind === 'call') {
      const callee = findCallee(r, statement);
      const angles = anglesOf(r, statement);
      const wires = statement.operands.map(({ name }) => places.get(name)!); // known: the definition was checked
      const modifications = modificationsOf(r, statement);
      checkWireCount(r, statement, callee, controlCount(modifications));
      const inner = callPiece(r, statement.at, callee, angles, modifications, wires);
      for (const operation of inner.operations) piece.operations.push(operation);
      piece.phase += inner.phase;
    } else if (statement.kind === 'barrier') {
      const named = statement.operands.map(({ name }) => places.get(name)!);
      const wires = named.length > 0 ? named : [...places.values()];
      spend(r, statement.at, wires.length);
      piece.operations.push({ kind: 'barrier', wires });
    } else if (statement.kind === 'for') {
      for (const value of loopValues(r, statement.over)) {
        spend(r, statement.at, 1);
        r.scopes.push(new Map([[statement.name.name, integerMeaning(value)]]));
        expandBody(r, statement.body, places, piece);
        r.scopes.pop();
      }
    }
  }
}

export function integerMeaning(value: number): Meaning {
  const constant: Value = { kind: 'int', value };
  return { kind: 'value', value: constant };
}

function anglesOf(r: Reader, call: GateCall): readonly number[] {
  return call.angles.length === 0
    ? NO_ANGLES
    : call.angles.map((node) => evaluateReal(r, node, 'an angle'));
}

/** Executes a gate call of the circuit itself: broadcasts over registers and emits the gates. */
export function executeCall(r: Reader, call: GateCall & { at: number }): void {
  const callee = findCallee(r, call);
  checkAngleCount(r, call, callee);
  const modifications = call.modifiers.length === 0 ? [] : modificationsOf(r, call);
  checkWireCount(r, call, callee, controlCount(modifications));
  const angles = anglesOf(r, call);
  const operands = call.operands.map((operand) => resolve(r, operand, 'qubits'));
  let length = -1;
  operands.forEach(({ places, scalar }, k) => {
    if (scalar) return;
    if (length >= 0 && places.length !== length) {
      const message = `expected registers of one length, got ${length} and ${places.length} qubits`;
      fail(r.problems, call.operands[k]!.at, 'size-mismatch', message);
    }
    length = places.length;
  });
  for (let k = 0; k < (length < 0 ? 1 : length); k++) {
    const wires = operands.map(({ places, scalar }) => places[scalar ? 0 : k]!);
    checkDistinct(r, call, wires);
    const isPlain = callee.kind === 'table' && modifications.length === 0;
    if (isPlain) {
      spend(r, call.at, 1 + wires.length);
      emit(r, call.at, tableGate(callee.entry.name, angles, wires));
    } else emitPiece(r, call.at, callPiece(r, call.at, callee, angles, modifications, wires));
  }
}

function emitPiece(r: Reader, at: number, piece: Piece): void {
  r.globalPhase += piece.phase;
  for (const operation of piece.operations) {
    emit(r, at, operation.kind === 'gate' ? foldControls(operation) : { ...operation });
  }
}

function checkDistinct(r: Reader, call: GateCall, wires: readonly number[]): void {
  for (let j = 1; j < wires.length; j++) {
    if (wires.indexOf(wires[j]!) === j) continue;
    const message = `gate ${call.name.name} uses the same qubit twice`;
    fail(r.problems, call.operands[j]!.at, 'duplicate-operand', message);
  }
}
