/**
 * Parses expressions, operands and index parts. Precedence climbing; chains of one rank become one flat node,
 * so that a long sum is not a deep tree. Nesting has a limit, which keeps the stack shallow for any text.
 */
import { fail } from './openqasm-problems.ts';
import { accept, advance, expect, expected, type Scanner, stands } from './openqasm-scanner.ts';
import type { Expression, IndexPart, Operand } from './openqasm-tree.ts';

/** Parentheses, signs and powers inside each other. */
export const DEPTH_MAX = 200;
/** Operands of one chain, items of one list. */
const TERMS_MAX = 100_000;

const RANKS: readonly string[][] = [
  ['||'],
  ['&&'],
  ['|'],
  ['^'],
  ['&'],
  ['==', '!='],
  ['<', '>', '<=', '>='],
  ['<<', '>>'],
  ['+', '-'],
  ['*', '/', '%'],
];
const RANK = new Map(RANKS.flatMap((operators, rank) => operators.map((op) => [op, rank])));
/** `^` is a power in 2.0. */
const RANK_2 = new Map([...RANK].filter(([op]) => ['+', '-', '*', '/'].includes(op)));
/** Types that may convert a value: `int(x)`, `int[32](x)`. */
const TYPES = new Set(['int', 'uint', 'float', 'angle', 'bool']);
const BIT_STRING = /^[01_]*[01][01_]*$/;

export type Dialect = '2.0' | '3';

export function parseExpression(s: Scanner, dialect: Dialect): Expression {
  return parseRank(s, dialect, 0);
}

function parseRank(s: Scanner, dialect: Dialect, lowest: number): Expression {
  const ranks = dialect === '3' ? RANK : RANK_2;
  let left = parseUnary(s, dialect);
  for (;;) {
    const rank = s.kind === 'symbol' ? ranks.get(s.word) : undefined;
    if (rank === undefined || rank < lowest) return left;
    const chain: Expression = { kind: 'chain', at: left.at, first: left, rest: [] };
    while (s.kind === 'symbol' && ranks.get(s.word) === rank) {
      const [operator, at] = [s.word, s.start];
      advance(s);
      chain.rest.push({ operator, at, of: parseRank(s, dialect, rank + 1) });
      if (chain.rest.length > TERMS_MAX) tooMany(s, at);
    }
    left = chain;
  }
}

function tooMany(s: Scanner, at: number): never {
  return fail(s.problems, at, 'too-large', `an expression of more than ${TERMS_MAX} terms`);
}

function parseUnary(s: Scanner, dialect: Dialect): Expression {
  if (++s.depth > DEPTH_MAX) {
    s.depth = 0;
    fail(s.problems, s.start, 'too-deep', `expressions nested more than ${DEPTH_MAX} deep`);
  }
  const isSign = s.kind === 'symbol' && /^[-+!~]$/.test(s.word);
  const node = isSign ? parseSigned(s, dialect) : parsePower(s, dialect);
  s.depth--;
  return node;
}

function parseSigned(s: Scanner, dialect: Dialect): Expression {
  const [operator, at] = [s.word, s.start];
  if (dialect === '2.0' && operator !== '-' && operator !== '+') expected(s, 'an expression');
  advance(s);
  return { kind: 'unary', at, operator, of: parseUnary(s, dialect) };
}

function parsePower(s: Scanner, dialect: Dialect): Expression {
  const base = parseAtom(s, dialect);
  if (!stands(s, dialect === '3' ? '**' : '^')) return base;
  advance(s);
  // right-associative, and tighter than a sign on its left but not on its right
  return { kind: 'power', at: base.at, base, exponent: parseUnary(s, dialect) };
}

function parseAtom(s: Scanner, dialect: Dialect): Expression {
  const at = s.start;
  switch (s.kind) {
    case 'integer':
    case 'real': {
      const value = numberOf(s.word);
      const integer = s.kind === 'integer';
      if (integer && !Number.isSafeInteger(value)) {
        fail(
          s.problems,
          at,
          'too-large',
          `integers must be below 2^53, got ${s.word.slice(0, 40)}`,
        );
      }
      advance(s);
      return { kind: 'number', at, value, integer };
    }
    case 'imaginary':
      return fail(s.problems, at, 'not-supported', 'complex numbers are not supported here');
    case 'timing':
      return fail(s.problems, at, 'not-supported', 'times and durations are not supported');
    case 'string': {
      const text = s.word;
      if (!BIT_STRING.test(text)) expected(s, 'a bit string of 0 and 1');
      advance(s);
      return { kind: 'bitString', at, text: text.replaceAll('_', '') };
    }
    case 'hardware':
      return refuseHardware(s);
    case 'name':
      return parseNamed(s, dialect);
    default: {
      if (!accept(s, '(')) expected(s, 'an expression');
      const inner = parseExpression(s, dialect);
      expect(s, ')', "to match '('");
      return inner;
    }
  }
}

function parseNamed(s: Scanner, dialect: Dialect): Expression {
  const [name, at] = [s.word, s.start];
  if (name === 'true' || name === 'false') {
    advance(s);
    return { kind: 'boolean', at, value: name === 'true' };
  }
  if (name === 'measure' && dialect === '3') {
    advance(s);
    return { kind: 'measure', at, operand: parseOperand(s, dialect) };
  }
  if (dialect === '3' && TYPES.has(name)) {
    advance(s);
    if (accept(s, '[')) {
      parseExpression(s, dialect);
      expect(s, ']', "to match '['");
    }
    expect(s, '(', 'after the type');
    return finishArguments(s, dialect, at, name);
  }
  const operand = parseOperand(s, dialect);
  if (operand.indices.length > 0 || !accept(s, '(')) return { kind: 'operand', at, operand };
  return finishArguments(s, dialect, at, name);
}

function finishArguments(s: Scanner, dialect: Dialect, at: number, name: string): Expression {
  const list: Expression[] = [];
  while (!accept(s, ')')) {
    if (list.length > 0) expect(s, ',', 'between arguments');
    list.push(parseExpression(s, dialect));
    if (list.length > TERMS_MAX) tooMany(s, at);
  }
  return { kind: 'call', at, name, arguments: list };
}

/** A function, because the compiler takes the kind of word for unchanged by `advance`. */
const isInteger = (s: Scanner): boolean => s.kind === 'integer';

function numberOf(word: string): number {
  return Number(
    word.replaceAll('_', '').replace(/^0([XOB])/, (_, base) => `0${base.toLowerCase()}`),
  );
}

function refuseHardware(s: Scanner): never {
  const message = `physical qubits (${s.word}) are not supported`;
  return fail(s.problems, s.start, 'not-supported', message, 'declare a register: qubit[n] q;');
}

/** `name`, `name[...]`, `name[...][...]`. */
export function parseOperand(s: Scanner, dialect: Dialect): Operand {
  if (s.kind === 'hardware') refuseHardware(s);
  if (s.kind !== 'name') expected(s, 'a register');
  const operand: Operand = { at: s.start, name: s.word, indices: [] };
  advance(s);
  while (stands(s, '[')) {
    const at = s.start;
    advance(s);
    if (dialect === '2.0' && !isInteger(s)) expected(s, 'an index (a whole number)');
    operand.indices.push(
      dialect === '3'
        ? parseIndex(s, dialect, at)
        : { kind: 'one', at, value: parseExpression(s, dialect) },
    );
    expect(s, ']', "to match '['");
    if (operand.indices.length > 16) {
      fail(s.problems, at, 'too-deep', 'more than 16 indices in a row');
    }
  }
  return operand;
}

/** What stands between `[` and `]`, or after `in` without its brackets. */
export function parseIndex(s: Scanner, dialect: Dialect, at: number): IndexPart {
  if (stands(s, '{')) return parseSet(s, dialect);
  const parts: (Expression | null)[] = [stands(s, ':') ? null : parseExpression(s, dialect)];
  while (stands(s, ':')) {
    if (parts.length === 3) expected(s, "']' after start:step:end");
    advance(s);
    parts.push(stands(s, ':') || stands(s, ']') ? null : parseExpression(s, dialect));
  }
  if (stands(s, ',')) {
    const hint = 'choose several with a set: q[{0, 2}]';
    fail(s.problems, s.start, 'unexpected', "expected ']', got ','", hint);
  }
  const [first = null, second = null, third = null] = parts;
  if (parts.length === 1) return { kind: 'one', at, value: first as Expression }; // never null: it was parsed
  return parts.length === 2
    ? { kind: 'range', at, first, step: null, last: second }
    : { kind: 'range', at, first, step: second, last: third };
}

export function parseSet(s: Scanner, dialect: Dialect): IndexPart {
  const at = s.start;
  expect(s, '{', 'to begin a set');
  const items: Expression[] = [];
  while (!accept(s, '}')) {
    if (items.length > 0) expect(s, ',', 'between the items of a set');
    items.push(parseExpression(s, dialect));
    if (items.length > TERMS_MAX) tooMany(s, at);
  }
  return { kind: 'set', at, items };
}
