/**
 * Parses the statements of OpenQASM 2.0 and 3, one at a time, by recursive descent.
 *
 * After a mistake the parser goes on where the next statement plainly begins (behind the next `;`, behind a
 * skipped block, or at a keyword that starts a line), so that one mistake gives one message. Names that a
 * broken or refused declaration would have introduced are remembered as spoilt: using them is no second mistake.
 */
import { parseExpression, parseIndex, parseOperand, parseSet } from './openqasm-expressions.ts';
import {
  DECLARING,
  NEVER_IN_GATE,
  ONLY_3,
  type Parser,
  REFUSED,
  STARTERS,
} from './openqasm-parser.ts';
import { Abandoned, fail, placeOf, report } from './openqasm-problems.ts';
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
import {
  endStatement,
  parseAlias,
  parseBarrier,
  parseCall,
  parseCallOrAssignment,
  parseConstant,
  parseInclude,
  parseMeasure,
  parseModifiers,
  parseNamed,
  parseOldRegister,
  parseOpaque,
  parseRegister,
  parseVersion,
  skipWidth,
} from './openqasm-simple-statements.ts';
import type { Expression, Named, Statement } from './openqasm-tree.ts';

/** Blocks inside each other. */
export const BLOCKS_MAX = 64;

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
  // a text where a statement should begin is a mistake where it stands, not where the one before it ended
  if (s.kind === 'string') {
    return fail(s.problems, s.start, 'unexpected', `expected a statement, got "${s.word}"`);
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
