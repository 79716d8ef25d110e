/** Parses the statements that hold no blocks: declarations, calls, assignments, measurements, barriers. */
import { gateTable } from '../circuit/gates.ts';
import { parseExpression, parseOperand } from './openqasm-expressions.ts';
import { CONSTANT_TYPES, type Parser, REFUSED, STARTERS } from './openqasm-parser.ts';
import { abandon, fail, Halted, report } from './openqasm-problems.ts';
import {
  accept,
  advance,
  expect,
  expected,
  expectName,
  found,
  type Scanner,
  stands,
} from './openqasm-scanner.ts';
import type { Expression, Modifier, Named, Operand, Statement } from './openqasm-tree.ts';

/** `ctrl @ inv @ ...` in one call. */
const MODIFIERS_MAX = 64;

/** The `;`. When it is missing but the next statement plainly begins, the statement counts all the same. */
export function endStatement(s: Scanner): void {
  if (accept(s, ';')) return;
  const starts = s.firstOnLine || STARTERS.has(s.word) || gateTable.has(s.word);
  const begins = s.kind === 'name' && starts;
  if (!(s.kind === 'end' || begins || stands(s, '}') || (s.firstOnLine && stands(s, '@')))) {
    expect(s, ';', 'to end the statement');
  }
  const message = `expected ';' to end the statement after '${s.previousWord.slice(0, 40)}', got ${found(s)}`;
  report(s.problems, s.previousEnd, 'unexpected', message);
}

export function parseVersion(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const text = s.word;
  if (s.kind !== 'integer' && s.kind !== 'real') expected(s, 'a version number');
  const place = s.start;
  advance(s);
  if (/^2(\.0)?$/.test(text)) p.dialect = '2.0';
  else if (!/^3(\.\d+)?$/.test(text)) {
    report(
      s.problems,
      place,
      'version',
      `expected version 2.0, 3.0 or 3.1, got ${text.slice(0, 40)}`,
    );
    throw new Halted();
  }
  endStatement(s);
  return { kind: 'version', at, text };
}

export function parseInclude(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  if (s.kind !== 'string') expected(s, 'a file name in quotes');
  const file = s.word;
  advance(s);
  endStatement(s);
  return { kind: 'include', at, file };
}

export function parseNamed(s: Scanner, what: string): Named {
  const at = s.start;
  return { at, name: expectName(s, what) };
}

/** `qreg q[3];` and `creg c[3];`, in 3 the size may be left out. */
export function parseOldRegister(p: Parser, at: number, word: 'qreg' | 'creg'): Statement {
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
export function parseRegister(p: Parser, at: number, word: 'qubit' | 'bit'): Statement {
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

export function parseConstant(p: Parser, at: number): Statement {
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
export function skipWidth(p: Parser): void {
  const s = p.scanner;
  if (!accept(s, '[')) return;
  parseExpression(s, p.dialect);
  expect(s, ']', "to match '['");
}

export function parseAlias(p: Parser, at: number): Statement {
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

export function parseMeasure(p: Parser, at: number): Statement {
  const s = p.scanner;
  advance(s);
  const operand = parseOperand(s, p.dialect);
  let target: Operand | null = null;
  if (p.dialect === '2.0') expect(s, '->', 'and a bit for the outcome');
  if (p.dialect === '2.0' || accept(s, '->')) target = parseOperand(s, p.dialect);
  endStatement(s);
  return { kind: 'measure', at, operand, target };
}

export function parseBarrier(p: Parser, at: number): Statement {
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

export function parseOpaque(p: Parser, at: number): Statement {
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

/** `ctrl @`, `negctrl(2) @`, `inv @`, `pow(0.5) @`, any number of them. */
export function parseModifiers(p: Parser): Modifier[] {
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

export function parseCall(p: Parser, at: number, modifiers: Modifier[]): Statement {
  const s = p.scanner;
  const name = parseNamed(s, 'the name of a gate');
  return finishCall(p, at, modifiers, name);
}

export function finishCall(p: Parser, at: number, modifiers: Modifier[], name: Named): Statement {
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
export function parseCallOrAssignment(p: Parser, at: number): Statement {
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
