/**
 * Evaluates expressions, constants as well as boolean expressions over bits that only the run knows, and finds
 * the wires and bits that operands with their indices stand for. `^` is exclusive or in 3 and a power in 2.0.
 */
import {
  arithmetic,
  bitsOfWidth,
  compare,
  constant,
  convert,
  fromBit,
  integersBitwise,
  numberOf,
  numeric,
  power,
  truth,
} from './openqasm-arithmetic.ts';
import { allOf, anyOf, negated, oddOf } from './openqasm-conditions.ts';
import {
  CONSTANTS,
  failUnknown,
  ITERATIONS_MAX,
  lookUp,
  type Reader,
  spend,
  type Value,
} from './openqasm-names.ts';
import { fail, halt, nearName } from './openqasm-problems.ts';
import type { Expression, IndexPart, Operand } from './openqasm-tree.ts';

type Chain = Extract<Expression, { kind: 'chain' }>;

export function evaluate(r: Reader, node: Expression): Value {
  switch (node.kind) {
    case 'number':
      return {
        kind: node.integer && r.parser.dialect === '3' ? 'int' : 'float',
        value: node.value,
      };
    case 'boolean':
      return { kind: 'bool', value: node.value };
    case 'bitString': {
      const bits = [...node.text].reverse().map((c) => constant(c === '1'));
      return { kind: 'bits', bits, scalar: false };
    }
    case 'operand':
      return evaluateName(r, node);
    case 'unary':
      return evaluateUnary(r, node.operator, evaluate(r, node.of), node.at);
    case 'power': {
      const base = evaluate(r, node.base);
      const exponent = evaluate(r, node.exponent);
      return power(r, node.at, base, exponent);
    }
    case 'chain':
      return evaluateChain(r, node);
    case 'call':
      return evaluateCall(r, node);
    case 'measure': {
      const message = 'measure must stand alone on the right of =';
      return fail(r.problems, node.at, 'not-allowed', message);
    }
  }
}

function evaluateName(r: Reader, node: Extract<Expression, { kind: 'operand' }>): Value {
  const { operand } = node;
  const known = lookUp(r, operand.name);
  if (known?.kind === 'value' && operand.indices.length === 0) return known.value;
  if (known?.kind === 'bits') {
    const { places, scalar } = resolve(r, operand, 'bits');
    spend(r, node.at, places.length);
    return { kind: 'bits', bits: places.map((bit) => ({ kind: 'bit', bit })), scalar };
  }
  if (known) {
    const message =
      known.kind === 'value'
        ? `${operand.name} is a single value: it takes no index`
        : `expected a value, got ${operand.name}, which is a qubit register`;
    fail(r.problems, node.at, 'wrong-kind', message);
  }
  const value = CONSTANTS.get(operand.name);
  if (value === undefined) return failUnknown(r, node.at, 'name', operand.name);
  return { kind: 'float', value };
}

function evaluateUnary(r: Reader, operator: string, value: Value, at: number): Value {
  if (operator === '!') return fromBit(negated(truth(r, value)));
  if (operator === '~') {
    if (value.kind === 'bits') return { ...value, bits: value.bits.map(negated) };
    return fail(r.problems, at, 'wrong-kind', '~ is supported on bits only');
  }
  const of = numberOf(r, value, at);
  return { kind: of.kind, value: operator === '-' ? -of.value : of.value };
}

function evaluateChain(r: Reader, node: Chain): Value {
  const operator = node.rest[0]!.operator;
  if (/^(?:&&|\|\||&|\||\^)$/.test(operator)) return evaluateBitwise(r, node, operator);
  let left = evaluate(r, node.first);
  for (const { operator: op, at, of } of node.rest) {
    const right = evaluate(r, of);
    if (/^[=!<>]=?$|^==$/.test(op) && op !== '!') left = compare(r, op, left, right, at);
    else left = arithmetic(r, op, numberOf(r, left, at), numberOf(r, right, at), at);
  }
  return left;
}

function evaluateBitwise(r: Reader, node: Chain, operator: string): Value {
  const values = [evaluate(r, node.first), ...node.rest.map(({ of }) => evaluate(r, of))];
  if (operator === '&&') return fromBit(allOf(values.map((v) => truth(r, v))));
  if (operator === '||') return fromBit(anyOf(values.map((v) => truth(r, v))));
  const combine = operator === '&' ? allOf : operator === '|' ? anyOf : oddOf;
  const at = node.rest[0]!.at;
  if (values.every((v) => v.kind === 'bool')) {
    return fromBit(combine(values.map((v) => truth(r, v))));
  }
  const width = Math.max(...values.map((v) => (v.kind === 'bits' ? v.bits.length : 0)));
  if (width === 0) return integersBitwise(r, operator, values, at);
  const columns = values.map((v) => bitsOfWidth(r, v, width, at));
  const bits = Array.from({ length: width }, (_, k) => combine(columns.map((c) => c[k]!)));
  const scalar = values.every((v) => v.kind !== 'bits' || v.scalar);
  return scalar ? fromBit(bits[0]!) : { kind: 'bits', bits, scalar };
}

const FUNCTIONS_3 = new Map<string, (x: number) => number>([
  ['sin', Math.sin],
  ['cos', Math.cos],
  ['tan', Math.tan],
  ['arcsin', Math.asin],
  ['arccos', Math.acos],
  ['arctan', Math.atan],
  ['exp', Math.exp],
  ['log', Math.log],
  ['sqrt', Math.sqrt],
  ['floor', Math.floor],
  ['ceiling', Math.ceil],
]);
const FUNCTIONS_2 = new Map<string, (x: number) => number>([
  ['sin', Math.sin],
  ['cos', Math.cos],
  ['tan', Math.tan],
  ['exp', Math.exp],
  ['ln', Math.log],
  ['sqrt', Math.sqrt],
]);

function evaluateCall(r: Reader, node: Extract<Expression, { kind: 'call' }>): Value {
  const { name, at } = node;
  const isNew = r.parser.dialect === '3';
  const takeCount = (count: number): void => {
    if (node.arguments.length === count) return;
    const message = `${name} takes ${count} argument${count === 1 ? '' : 's'}, got ${node.arguments.length}`;
    fail(r.problems, at, 'wrong-count', message);
  };
  const single = (isNew ? FUNCTIONS_3 : FUNCTIONS_2).get(name);
  if (single) {
    takeCount(1);
    return numeric(r, at, 'float', single(numberOf(r, evaluate(r, node.arguments[0]!), at).value));
  }
  if (isNew && (name === 'pow' || name === 'mod')) {
    takeCount(2);
    const [a, b] = node.arguments.map((argument) => evaluate(r, argument)) as [Value, Value]; // two, as checked
    if (name === 'pow') return power(r, at, a, b);
    return arithmetic(r, '%', numberOf(r, a, at), numberOf(r, b, at), at);
  }
  if (isNew && /^(?:int|uint|float|angle|bool)$/.test(name)) {
    takeCount(1);
    return convert(r, name, evaluate(r, node.arguments[0]!), at, true);
  }
  const known = [...(isNew ? FUNCTIONS_3 : FUNCTIONS_2).keys(), ...(isNew ? ['pow', 'mod'] : [])];
  const near = nearName(r.problems, name, known);
  if (r.parser.spoilt.has(name)) return failUnknown(r, at, 'function', name);
  const hint = near ? `did you mean ${near}?` : `known are ${known.join(', ')}`;
  return fail(r.problems, at, 'unknown-function', `unknown function: ${name}`, hint);
}

/** An integer that the text alone decides. */
export function evaluateInteger(r: Reader, node: Expression, what: string): number {
  const value = numberOf(r, evaluate(r, node), node.at);
  const isWhole = Number.isSafeInteger(value.value);
  // 2.0 has no types: there a whole number is an integer
  if (isWhole && (value.kind === 'int' || r.parser.dialect === '2.0')) return value.value;
  return fail(
    r.problems,
    node.at,
    'wrong-kind',
    `expected ${what} that is an integer, got ${value.value}`,
  );
}

/** A finite real number: an angle or an exponent. */
export function evaluateReal(r: Reader, node: Expression, what: string): number {
  const { value } = numberOf(r, evaluate(r, node), node.at);
  if (Number.isFinite(value)) return value === 0 ? 0 : value;
  return fail(r.problems, node.at, 'not-finite', `expected ${what} that is finite, got ${value}`);
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

/** A size in brackets, at least 1 and within the limit. */
export function sizeOf(
  r: Reader,
  size: Expression,
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
