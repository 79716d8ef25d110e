/**
 * Operations on the values of expressions: typed arithmetic, comparisons, conversions.
 *
 * Convention: OpenQASM 3 rules for constants (integers stay integers, their division truncates towards zero
 * and is warned of when that loses something); 2.0 has real arithmetic only. Registers compare as unsigned
 * numbers, bit 0 least significant.
 */
import type { BitExpression } from '../circuit/circuit.ts';
import {
  allOf,
  anyOf,
  bitEquals,
  compareBits,
  negated,
  registerEquals,
} from './openqasm-conditions.ts';
import { type Reader, spend, type Value } from './openqasm-names.ts';
import { fail, warn } from './openqasm-problems.ts';

export const constant = (value: boolean): BitExpression => ({ kind: 'constant', value });

/** A single boolean; what is constant becomes a constant of the text. */
export function fromBit(bit: BitExpression): Value {
  return bit.kind === 'constant'
    ? { kind: 'bool', value: bit.value }
    : { kind: 'bits', bits: [bit], scalar: true };
}

/** A value as a condition: numbers are true when they are not zero, registers when any bit is set. */
export function truth(_r: Reader, value: Value): BitExpression {
  if (value.kind === 'bool') return constant(value.value);
  if (value.kind !== 'bits') return constant(value.value !== 0);
  return value.bits.length === 1 ? value.bits[0]! : anyOf(value.bits);
}

export type Numeric = { kind: 'int' | 'float'; value: number };

export function numberOf(r: Reader, value: Value, at: number): Numeric {
  if (value.kind === 'bits') {
    const message = 'expected a constant, got bits that only the run knows';
    return fail(r.problems, at, 'not-constant', message);
  }
  return value.kind === 'bool' ? { kind: 'int', value: Number(value.value) } : value;
}

export function integersBitwise(
  r: Reader,
  operator: string,
  values: readonly Value[],
  at: number,
): Value {
  const numbers = values.map((v) => {
    const { kind, value } = numberOf(r, v, at);
    if (kind !== 'int') fail(r.problems, at, 'wrong-kind', `${operator} takes integers or bits`);
    return BigInt(value);
  });
  const result = numbers.reduce((a, b) =>
    operator === '&' ? a & b : operator === '|' ? a | b : a ^ b,
  );
  return { kind: 'int', value: Number(result) };
}

/** A value as `width` bits, least significant first; a number must fit. */
export function bitsOfWidth(
  r: Reader,
  value: Value,
  width: number,
  at: number,
): readonly BitExpression[] {
  if (value.kind === 'bits') {
    if (value.bits.length === width) return value.bits;
    const message = `expected ${width} bits, got ${value.bits.length}`;
    return fail(r.problems, at, 'size-mismatch', message);
  }
  const number = Number(value.value);
  if (!Number.isSafeInteger(number) || number < 0 || number >= 2 ** width) {
    const message = `expected a whole number that fits ${width} bit${width === 1 ? '' : 's'}, got ${number}`;
    return fail(r.problems, at, 'size-mismatch', message);
  }
  return Array.from({ length: width }, (_, k) => constant(bitOf(number, k)));
}

const bitOf = (number: number, k: number): boolean => Math.floor(number / 2 ** k) % 2 === 1;

export function compare(r: Reader, op: string, left: Value, right: Value, at: number): Value {
  if (left.kind !== 'bits' && right.kind !== 'bits') {
    const [a, b] = [numberOf(r, left, at).value, numberOf(r, right, at).value];
    const holds = {
      '==': a === b,
      '!=': a !== b,
      '<': a < b,
      '<=': a <= b,
      '>': a > b,
      '>=': a >= b,
    };
    return { kind: 'bool', value: holds[op as keyof typeof holds] }; // op is one of the six
  }
  if (left.kind !== 'bits') {
    const mirrored = op.replace(/[<>]/, (c) => (c === '<' ? '>' : '<'));
    return compare(r, mirrored, right, left, at);
  }
  spend(r, at, left.bits.length * (/[<>]/.test(op) ? left.bits.length : 1));
  if (right.kind === 'bits') {
    if (left.bits.length !== right.bits.length) {
      const message = `expected registers of one length, got ${left.bits.length} and ${right.bits.length} bits`;
      fail(r.problems, at, 'size-mismatch', message);
    }
    return fromBit(compareBits(op, left.bits, right.bits));
  }
  const number = Number(right.value);
  if (!Number.isInteger(number)) {
    fail(
      r.problems,
      at,
      'wrong-kind',
      `expected a whole number to compare bits with, got ${number}`,
    );
  }
  if (left.scalar && (op === '==' || op === '!=') && (number === 0 || number === 1)) {
    const same = bitEquals(left.bits[0]!, number === 1);
    return fromBit(op === '==' ? same : negated(same));
  }
  return fromBit(compareWithNumber(r, op, left.bits, number, at));
}

/** A register as an unsigned number, compared with a constant. */
function compareWithNumber(
  r: Reader,
  op: string,
  bits: readonly BitExpression[],
  number: number,
  at: number,
): BitExpression {
  const top = 2 ** bits.length;
  const always = (value: boolean): BitExpression => {
    const message = `the comparison with ${number} is always ${value}: the register has ${bits.length} bits`;
    warn(r.problems, at, 'constant-condition', message);
    return constant(value);
  };
  switch (op) {
    case '==':
      return number < 0 || number >= top ? always(false) : registerEquals(bits, number);
    case '!=':
      return number < 0 || number >= top ? always(true) : negated(registerEquals(bits, number));
    case '<':
      if (number <= 0) return always(false);
      return number >= top ? always(true) : belowNumber(bits, number);
    case '<=':
      return compareWithNumber(r, '<', bits, number + 1, at);
    case '>':
      return negated(compareWithNumber(r, '<', bits, number + 1, at));
    default:
      return negated(compareWithNumber(r, '<', bits, number, at));
  }
}

/** value < number: for some set bit k of the number, bit k is 0 and all higher bits agree. */
function belowNumber(bits: readonly BitExpression[], number: number): BitExpression {
  const cases: BitExpression[] = [];
  for (let k = 0; k < bits.length; k++) {
    if (!bitOf(number, k)) continue;
    const parts = [negated(bits[k]!)];
    for (let h = k + 1; h < bits.length; h++) parts.push(bitEquals(bits[h]!, bitOf(number, h)));
    cases.push(allOf(parts));
  }
  return anyOf(cases);
}

export function arithmetic(r: Reader, op: string, a: Numeric, b: Numeric, at: number): Value {
  const kind = a.kind === 'int' && b.kind === 'int' ? 'int' : 'float';
  const [x, y] = [a.value, b.value];
  if ((op === '/' || op === '%') && y === 0) {
    fail(r.problems, at, 'not-finite', 'division by zero');
  }
  switch (op) {
    case '+':
      return numeric(r, at, kind, x + y);
    case '-':
      return numeric(r, at, kind, x - y);
    case '*':
      return numeric(r, at, kind, x * y);
    case '/': {
      if (kind === 'float' || r.realDivision) return numeric(r, at, 'float', x / y);
      const whole = Math.trunc(x / y);
      if (whole !== x / y) {
        const message = `${x} / ${y} divides integers and gives ${whole}; write ${x}.0 / ${y} for a fraction`;
        warn(r.problems, at, 'integer-division', message);
      }
      return numeric(r, at, kind, whole);
    }
    case '%':
      return numeric(r, at, kind, x % y);
    default: {
      if (kind !== 'int' || y < 0 || y > 60) {
        fail(r.problems, at, 'wrong-kind', `${op} takes integers and a shift in [0, 60]`);
      }
      return numeric(r, at, kind, op === '<<' ? x * 2 ** y : Math.floor(x / 2 ** y));
    }
  }
}

export function numeric(r: Reader, at: number, kind: 'int' | 'float', value: number): Value {
  if (!Number.isFinite(value)) {
    fail(r.problems, at, 'not-finite', `expected a finite number, got ${value}`);
  }
  if (kind === 'int' && !Number.isSafeInteger(value)) {
    fail(r.problems, at, 'too-large', `integers must be below 2^53, got ${value}`);
  }
  return { kind, value: value === 0 ? 0 : value };
}

export function power(r: Reader, at: number, base: Value, exponent: Value): Value {
  const a = numberOf(r, base, at);
  const b = numberOf(r, exponent, at);
  const kind = a.kind === 'int' && b.kind === 'int' && b.value >= 0 ? 'int' : 'float';
  return numeric(r, at, kind, a.value ** b.value);
}

/** A value as a type of the language; `explicit` allows what loses something. */
export function convert(
  r: Reader,
  type: string,
  value: Value,
  at: number,
  explicit = false,
): Value {
  if (type === 'bool') return fromBit(truth(r, value));
  // a register under int(...) or uint(...) is what comparisons take it for anyway
  if (explicit && value.kind === 'bits' && (type === 'uint' || type === 'int')) return value;
  const { kind, value: number } = numberOf(r, value, at);
  if (type === 'float' || type === 'angle') return { kind: 'float', value: number };
  const whole = explicit ? Math.trunc(number) : number;
  if (!Number.isSafeInteger(whole) || (type === 'uint' && whole < 0)) {
    const wanted = type === 'uint' ? 'an integer >= 0' : 'an integer';
    fail(r.problems, at, 'wrong-kind', `expected ${wanted}, got ${number}`);
  }
  if (kind === 'float' && !explicit && whole !== number) {
    fail(r.problems, at, 'wrong-kind', `expected an integer, got ${number}`);
  }
  return { kind: 'int', value: whole };
}
