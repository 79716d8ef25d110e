/**
 * Parses the statements of OpenQASM 2.0 and 3, one at a time, by recursive descent.
 *
 * After a mistake the parser goes on where the next statement plainly begins (behind the next `;`, behind a
 * skipped block, or at a keyword that starts a line), so that one mistake gives one message. Names that a
 * broken or refused declaration would have introduced are remembered as spoilt: using them is no second mistake.
 */

import { gateTable } from '../circuit/gates.ts';
import {
  type Dialect,
  parseExpression,
  parseIndex,
  parseOperand,
  parseSet,
} from './openqasm-expressions.ts';
import { Abandoned, abandon, fail, Halted, placeOf, report } from './openqasm-problems.ts';
import {
  accept,
  advance,
  expect,
  expected,
  expectName,
  found,
  restOfLine,
  type Scanner,
  stands,
} from './openqasm-scanner.ts';
import type { Expression, Modifier, Named, Operand, Statement } from './openqasm-tree.ts';

/** Blocks inside each other. */
export const BLOCKS_MAX = 64;
/** `ctrl @ inv @ ...` in one call. */
const MODIFIERS_MAX = 64;

export type Parser = {
  scanner: Scanner;
  dialect: Dialect;
  /** Names whose declaration was wrong or refused. */
  spoilt: Set<string>;
  /** Names of the gates that the text defines. */
  gates: Set<string>;
  /** Blocks open now. */
  blocks: number;
  inGate: boolean;
};

/** Why a keyword of the language is refused, as the end of a sentence. */
const REFUSED = new Map<string, string>([
  ['def', 'subroutines (def) are not supported'],
  ['extern', 'external functions (extern) are not supported'],
  ['defcal', 'pulse definitions (defcal) are not supported'],
  ['defcalgrammar', 'pulse grammars (defcalgrammar) are not supported'],
  ['cal', 'pulse blocks (cal) are not supported'],
  ['while', 'while loops are not supported: their length is not known before the run'],
  ['switch', 'switch is not supported; use if'],
  ['break', 'break is not supported'],
  ['continue', 'continue is not supported'],
  ['return', 'return is not supported'],
  ['end', 'end is not supported'],
  ['delay', 'delay is not supported: timing belongs to the device'],
  ['box', 'box is not supported: timing belongs to the device'],
  ['nop', 'nop is not supported'],
  ['duration', 'durations are not supported: timing belongs to the device'],
  ['stretch', 'stretches are not supported: timing belongs to the device'],
  ['array', 'arrays are not supported'],
  ['input', 'input parameters are not supported; write the value as a const'],
  ['output', 'output declarations are not supported; every bit is an output'],
  ['complex', 'variables of type complex are not supported'],
  ['int', 'variables of type int are not supported; use const int'],
  ['uint', 'variables of type uint are not supported; use const uint'],
  ['float', 'variables of type float are not supported; use const float'],
  ['angle', 'variables of type angle are not supported; use const angle'],
  ['bool', 'variables of type bool are not supported; use bit or const bool'],
]);
const CONSTANT_TYPES = new Set(['int', 'uint', 'float', 'angle', 'bool']);
const DECLARING =
  /^(?:qubit|bit|qreg|creg|const|let|gate|opaque|def|extern|input|output|int|uint|float|angle|bool|complex|array|duration|stretch)\b/;
const NEVER_IN_GATE = new Set([
  'OPENQASM',
  'include',
  'qubit',
  'qreg',
  'bit',
  'creg',
  'gate',
  'opaque',
]);
const ONLY_3 = new Set(
  'qubit bit const let for ctrl negctrl inv pow gphase pragma else'.split(' '),
);
const STARTERS = new Set([
  ...REFUSED.keys(),
  ...NEVER_IN_GATE,
  ...[
    'const',
    'let',
    'measure',
    'reset',
    'barrier',
    'if',
    'for',
    'pragma',
    'ctrl',
    'negctrl',
    'inv',
  ],
]);

export function parserOf(scanner: Scanner): Parser {
  return { scanner, dialect: '3', spoilt: new Set(), gates: new Set(), blocks: 0, inGate: false };
}

/**
 * The next statement of the text; null where one was given up after a mistake, undefined at the end.
 */
export function nextStatement(p: Parser): Statement | null | undefined {
  const s = p.scanner;
  if (s.kind === 'end') return undefined;
  if (stands(s, '}')) {
    report(s.problems, s.start, 'unexpected', "unexpected '}': no block is open here");
    recover(p, s.start, true);
    return null;
  }
  return statementOrNull(p);
}

function statementOrNull(p: Parser): Statement | null {
  const s = p.scanner;
  const start = s.start;
  const { blocks, inGate } = p;
  s.depth = 0;
  try {
    return parseStatement(p);
  } catch (error) {
    if (!(error instanceof Abandoned)) throw error;
    p.blocks = blocks;
    p.inGate = inGate;
    recover(p, start, s.start === start);
    return null;
  }
}

const atEnd = (s: Scanner): boolean => s.kind === 'end';
const isName = (s: Scanner): boolean => s.kind === 'name';

/** Skips to where the next statement begins; `move` when the current word must not be tried again. */
function recover(p: Parser, statementStart: number, move: boolean): void {
  const s = p.scanner;
  try {
    let open = 0;
    if (move && !stands(s, ';') && !stands(s, '{')) advance(s);
    while (!atEnd(s) && !accept(s, ';') && !(open === 0 && stands(s, '}'))) {
      if (stands(s, '{')) {
        const isSet = open > 0 || /^(?:\[|=|in)$/.test(s.previousWord);
        skipBlock(s);
        if (isSet || accept(s, 'else')) continue;
        break;
      }
      if (s.firstOnLine && (stands(s, '@') || (isName(s) && STARTERS.has(s.word)))) break;
      if (stands(s, '[') || stands(s, '(')) open++;
      else if (stands(s, ']') || stands(s, ')')) open = Math.max(0, open - 1);
      advance(s);
    }
  } catch (error) {
    if (!(error instanceof Abandoned)) throw error; // an unfinished comment: told, and the text is over
  }
  const skipped = s.text.slice(statementStart, Math.min(s.start, statementStart + 2000));
  if (DECLARING.test(skipped)) {
    const head = /^[^;={]*/.exec(skipped)?.[0] ?? '';
    for (const [name] of head.matchAll(/[\p{L}_][\p{L}\p{N}_]*/gu)) p.spoilt.add(name);
  }
}

/** Skips from `{` past the `}` that closes it. */
function skipBlock(s: Scanner): void {
  let open = 0;
  while (s.kind !== 'end') {
    if (stands(s, '{')) open++;
    else if (stands(s, '}')) open--;
    advance(s);
    if (open === 0) return;
  }
}

function parseStatement(p: Parser): Statement {
  const s = p.scanner;
  const annotations: string[] = [];
  while (stands(s, '@')) {
    const text = restOfLine(s, s.end);
    if (text === '') expected(s, 'a name after @');
    annotations.push(text);
  }
  const statement = parseBare(p);
  if (annotations.length > 0) statement.annotations = annotations;
  return statement;
}

function parseBare(p: Parser): Statement {
  const s = p.scanner;
  const at = s.start;
  if (stands(s, '#')) {
    advance(s);
    if (!stands(s, 'pragma')) expected(s, "'pragma' after #");
  }
  if (s.kind !== 'name') return expected(s, 'a statement');
  const word = s.word;
  if (p.inGate && /^(?:measure|reset|if|let|const)$/.test(word)) {
    fail(s.problems, at, 'not-allowed', `${word} is not allowed in a gate body`);
  }
  switch (word) {
    case 'OPENQASM':
      return parseVersion(p, at);
    case 'include':
      return parseInclude(p, at);
    case 'qreg':
    case 'creg':
      return parseOldRegister(p, at, word);
    case 'gate':
      return parseGate(p, at);
    case 'measure':
      return parseMeasure(p, at);
    case 'reset': {
      advance(s);
      const operand = parseOperand(s, p.dialect);
      endStatement(s);
      return { kind: 'reset', at, operand };
    }
    case 'barrier':
      return parseBarrier(p, at);
    case 'if':
      return parseIf(p, at);
    case 'opaque':
      return parseOpaque(p, at);
    default:
      if (p.dialect === '3') return parseBare3(p, at, word);
      if ((REFUSED.has(word) || ONLY_3.has(word)) && !p.gates.has(word)) {
        const message = `${word} belongs to OpenQASM 3, but the text says version 2.0`;
        fail(s.problems, at, 'not-supported', message);
      }
      return parseCall(p, at, []);
  }
}

/** Statements that only version 3 has. */
function parseBare3(p: Parser, at: number, word: string): Statement {
  const s = p.scanner;
  const refused = REFUSED.get(word);
  if (refused) return fail(s.problems, at, 'not-supported', refused);
  switch (word) {
    case 'pragma':
      return { kind: 'pragma', at, text: restOfLine(s, s.end) };
    case 'qubit':
    case 'bit':
      return parseRegister(p, at, word);
    case 'const':
      return parseConstant(p, at);
    case 'let':
      return parseAlias(p, at);
    case 'for':
      return parseFor(p, at);
    case 'ctrl':
    case 'negctrl':
    case 'inv':
    case 'pow':
      return parseCall(p, at, parseModifiers(p));
    case 'else':
      return fail(s.problems, at, 'unexpected', "unexpected 'else': no if stands before it");
    default:
      return parseCallOrAssignment(p, at);
  }
}

/** The `;`. When it is missing but the next statement plainly begins, the statement counts all the same. */
function endStatement(s: Scanner): void {
  if (accept(s, ';')) return;
  const starts = s.firstOnLine || STARTERS.has(s.word) || gateTable.has(s.word);
  const begins = s.kind === 'name' && starts;
  if (!(s.kind === 'end' || begins || stands(s, '}') || (s.firstOnLine && stands(s, '@')))) {
    expect(s, ';', 'to end the statement');
  }
  const message = `expected ';' to end the statement after '${s.previousWord.slice(0, 40)}', got ${found(s)}`;
  report(s.problems, s.previousEnd, 'unexpected', message);
}

function parseVersion(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const text = s.word;
  if (s.kind !== 'integer' && s.kind !== 'real') expected(s, 'a version number');
  const place = s.start;
  advance(s);
  if (/^2(\.0)?$/.test(text)) p.dialect = '2.0';
  else if (!/^3(\.\d+)?$/.test(text)) {
    report(s.problems, place, 'version', `expected version 2.0, 3.0 or 3.1, got ${text}`);
    throw new Halted();
  }
  endStatement(s);
  return { kind: 'version', at, text };
}

function parseInclude(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  if (s.kind !== 'string') expected(s, 'a file name in quotes');
  const file = s.word;
  advance(s);
  endStatement(s);
  return { kind: 'include', at, file };
}

function parseNamed(s: Scanner, what: string): Named {
  const at = s.start;
  return { at, name: expectName(s, what) };
}

/** `qreg q[3];` and `creg c[3];`, in 3 the size may be left out. */
function parseOldRegister(p: Parser, at: number, word: 'qreg' | 'creg'): Statement {
  const s = p.scanner;
  advance(s);
  const name = parseNamed(s, 'a name for the register');
  let size: Expression | null = null;
  if (p.dialect === '2.0') expect(s, '[', 'to begin the size');
  if (p.dialect === '2.0' || accept(s, '[')) {
    size = parseExpression(s, p.dialect);
    expect(s, ']', "to match '['");
  }
  endStatement(s);
  return word === 'qreg'
    ? { kind: 'qubits', at, name, size }
    : { kind: 'bits', at, name, size, value: null };
}

/** `qubit[3] q;`, `qubit a;`, `bit[3] c;`, `bit c = measure q[0];`. */
function parseRegister(p: Parser, at: number, word: 'qubit' | 'bit'): Statement {
  const s = p.scanner;
  advance(s);
  let size: Expression | null = null;
  if (accept(s, '[')) {
    size = parseExpression(s, p.dialect);
    expect(s, ']', "to match '['");
  }
  const name = parseNamed(s, 'a name for the register');
  if (stands(s, '[') && !size) {
    const hint = `the size stands before the name: ${word}[n] ${name.name};`;
    fail(s.problems, s.start, 'unexpected', "expected ';', got '['", hint);
  }
  if (word === 'qubit') {
    endStatement(s);
    return { kind: 'qubits', at, name, size };
  }
  const value = accept(s, '=') ? parseExpression(s, p.dialect) : null;
  endStatement(s);
  return { kind: 'bits', at, name, size, value };
}

function parseConstant(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const type = s.word;
  if (!CONSTANT_TYPES.has(type)) {
    if (s.kind === 'name' && (REFUSED.has(type) || type === 'bit' || type === 'qubit')) {
      fail(s.problems, s.start, 'not-supported', `constants of type ${type} are not supported`);
    }
    expected(s, 'a type: int, uint, float, angle or bool');
  }
  advance(s);
  skipWidth(p);
  const name = parseNamed(s, 'a name for the constant');
  expect(s, '=', 'and a value');
  const value = parseExpression(s, p.dialect);
  endStatement(s);
  return { kind: 'constant', at, type, name, value };
}

/** The `[32]` of a type; widths beyond what a double holds are nobody's need here. */
function skipWidth(p: Parser): void {
  const s = p.scanner;
  if (!accept(s, '[')) return;
  parseExpression(s, p.dialect);
  expect(s, ']', "to match '['");
}

function parseAlias(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const name = parseNamed(s, 'a name for the alias');
  expect(s, '=', 'and a register');
  const parts: Operand[] = [];
  do {
    parts.push(parseOperand(s, p.dialect));
  } while (accept(s, '++'));
  endStatement(s);
  return { kind: 'alias', at, name, parts };
}

function parseGate(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const name = parseNamed(s, 'a name for the gate');
  p.gates.add(name.name);
  const parameters: Named[] = [];
  if (accept(s, '(')) {
    while (!accept(s, ')')) {
      if (parameters.length > 0) expect(s, ',', 'or ) between the parameters');
      parameters.push(parseNamed(s, 'a parameter'));
    }
  }
  const operands: Named[] = [];
  do {
    operands.push(parseNamed(s, 'a qubit of the gate'));
  } while (accept(s, ','));
  p.inGate = true;
  const body = parseBlock(p, `the body of gate ${name.name}`);
  p.inGate = false;
  return { kind: 'gate', at, name, parameters, operands, body };
}

/** `{ ... }`; every statement in it may fail by itself. */
function parseBlock(p: Parser, what: string): Statement[] {
  const s = p.scanner;
  const open = s.start;
  expect(s, '{', `to begin ${what}`);
  if (++p.blocks > BLOCKS_MAX) {
    fail(s.problems, open, 'too-deep', `blocks nested more than ${BLOCKS_MAX} deep`);
  }
  const body: Statement[] = [];
  while (!stands(s, '}')) {
    const isOutside = p.inGate && s.firstOnLine && s.kind === 'name' && NEVER_IN_GATE.has(s.word);
    if (s.kind === 'end' || isOutside) {
      const { line } = placeOf(s.problems, open);
      const message = `expected '}' to end ${what}, which begins in line ${line}, got ${found(s)}`;
      report(s.problems, s.previousEnd, 'unexpected', message);
      p.blocks--;
      return body;
    }
    const statement = statementOrNull(p);
    if (statement) body.push(statement);
  }
  advance(s);
  p.blocks--;
  return body;
}

/** A block, or one statement without braces. */
function parseBody(p: Parser, what: string): Statement[] {
  const s = p.scanner;
  if (stands(s, '{')) return parseBlock(p, what);
  if (++p.blocks > BLOCKS_MAX) {
    fail(s.problems, s.start, 'too-deep', `blocks nested more than ${BLOCKS_MAX} deep`);
  }
  const statement = parseStatement(p);
  p.blocks--;
  return [statement];
}

function parseMeasure(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const operand = parseOperand(s, p.dialect);
  let target: Operand | null = null;
  if (p.dialect === '2.0') expect(s, '->', 'and a bit for the outcome');
  if (p.dialect === '2.0' || accept(s, '->')) target = parseOperand(s, p.dialect);
  endStatement(s);
  return { kind: 'measure', at, operand, target };
}

function parseBarrier(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const operands: Operand[] = [];
  if (!(p.dialect === '3' && stands(s, ';'))) {
    do {
      operands.push(parseOperand(s, p.dialect));
    } while (accept(s, ','));
  }
  endStatement(s);
  return { kind: 'barrier', at, operands };
}

function parseIf(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  expect(s, '(', 'to begin the condition');
  const condition = p.dialect === '3' ? parseExpression(s, '3') : parseOldCondition(p);
  expect(s, ')', 'to end the condition');
  const then = p.dialect === '3' ? parseBody(p, 'the body of if') : [parseStatement(p)];
  let otherwise: Statement[] = [];
  if (p.dialect === '3' && accept(s, 'else')) otherwise = parseBody(p, 'the body of else');
  return { kind: 'if', at, condition, then, otherwise };
}

/** `c == 3`: all that 2.0 knows. */
function parseOldCondition(p: Parser): Expression {
  const s = p.scanner;
  const operand = parseOperand(s, p.dialect);
  const first: Expression = { kind: 'operand', at: operand.at, operand };
  const at = s.start;
  expect(s, '==', 'in the condition');
  if (s.kind !== 'integer') expected(s, 'a whole number');
  const of = parseExpression(s, p.dialect);
  return { kind: 'chain', at: operand.at, first, rest: [{ operator: '==', at, of }] };
}

function parseOpaque(p: Parser, at: number): Statement {
  const s = p.scanner;
  if (p.dialect === '3') {
    fail(s.problems, at, 'not-supported', 'opaque gates are not supported');
  }
  advance(s);
  const name = parseNamed(s, 'a name for the gate');
  p.gates.add(name.name);
  while (s.kind !== 'end' && !stands(s, ';') && !s.firstOnLine) advance(s);
  endStatement(s);
  return { kind: 'opaque', at, name };
}

function parseFor(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const type = expectName(s, 'the type of the loop variable');
  if (stands(s, 'in')) {
    const hint = `write for int ${type} in ...`;
    fail(
      s.problems,
      s.previousEnd - type.length,
      'unexpected',
      `expected a type, got '${type}'`,
      hint,
    );
  }
  if (type !== 'int' && type !== 'uint') {
    const hint = 'write for int i in [0:3] { ... }';
    const start = s.previousEnd - type.length;
    fail(s.problems, start, 'not-supported', `loops over ${type} are not supported`, hint);
  }
  skipWidth(p);
  const name = parseNamed(s, 'a name for the loop variable');
  expect(s, 'in', 'and a range');
  const place = s.start;
  let over = stands(s, '{') ? parseSet(s, p.dialect) : undefined;
  if (!over) {
    if (!accept(s, '[')) expected(s, 'a range [a:b] or a set {a, b}');
    over = parseIndex(s, p.dialect, place);
    expect(s, ']', "to match '['");
  }
  const body = parseBody(p, 'the body of for');
  return { kind: 'for', at, name, over, body };
}

/** `ctrl @`, `negctrl(2) @`, `inv @`, `pow(0.5) @`, any number of them. */
function parseModifiers(p: Parser): Modifier[] {
  const s = p.scanner;
  const modifiers: Modifier[] = [];
  while (s.kind === 'name' && /^(?:ctrl|negctrl|inv|pow)$/.test(s.word)) {
    const [word, at] = [s.word, s.start];
    advance(s);
    if (word === 'inv') modifiers.push({ kind: 'inverse', at });
    else if (word === 'pow') {
      expect(s, '(', 'to begin the exponent');
      const exponent = parseExpression(s, p.dialect);
      expect(s, ')', "to match '('");
      modifiers.push({ kind: 'power', at, exponent });
    } else {
      let count: Expression | null = null;
      if (accept(s, '(')) {
        count = parseExpression(s, p.dialect);
        expect(s, ')', "to match '('");
      }
      modifiers.push({ kind: 'control', at, positive: word === 'ctrl', count });
    }
    expect(s, '@', 'to end the modifier');
    if (modifiers.length > MODIFIERS_MAX) {
      fail(s.problems, at, 'too-deep', `more than ${MODIFIERS_MAX} modifiers in one call`);
    }
  }
  return modifiers;
}

function parseCall(p: Parser, at: number, modifiers: Modifier[]): Statement {
  const s = p.scanner;
  const name = parseNamed(s, 'the name of a gate');
  return finishCall(p, at, modifiers, name);
}

function finishCall(p: Parser, at: number, modifiers: Modifier[], name: Named): Statement {
  const s = p.scanner;
  if (p.spoilt.has(name.name)) abandon(); // told where it was declared
  const angles: Expression[] = [];
  if (accept(s, '(')) {
    while (!accept(s, ')')) {
      if (angles.length > 0) expect(s, ',', "or ')' between the angles");
      angles.push(parseExpression(s, p.dialect));
    }
  }
  const operands: Operand[] = [];
  if (!(name.name === 'gphase' && stands(s, ';'))) {
    do {
      operands.push(parseOperand(s, p.dialect));
    } while (accept(s, ','));
  }
  endStatement(s);
  return { kind: 'call', at, modifiers, name, angles, operands };
}

/** A statement that begins with a name: `cx q[0], q[1];` or `c[0] = ...;`. */
function parseCallOrAssignment(p: Parser, at: number): Statement {
  const s = p.scanner;
  const operand = parseOperand(s, p.dialect);
  if (operand.indices.length === 0 && !/^(?:=|[&|^]=|[-+*/%]=|<<=|>>=|~=|\*\*=)$/.test(s.word)) {
    return finishCall(p, at, [], { at, name: operand.name });
  }
  const operator = s.word;
  if (s.kind !== 'symbol' || !operator.endsWith('=') || operator.length > 3) {
    expect(s, '=', 'and a value');
  }
  if (p.inGate) fail(s.problems, at, 'not-allowed', 'assignments are not allowed in a gate body');
  if (!/^(?:=|[&|^]=)$/.test(operator)) {
    const message = `the assignment ${operator} is not supported; use =, &=, |= or ^=`;
    fail(s.problems, s.start, 'not-supported', message);
  }
  advance(s);
  const value = parseExpression(s, p.dialect);
  endStatement(s);
  return { kind: 'assign', at, target: operand, operator, value };
}
