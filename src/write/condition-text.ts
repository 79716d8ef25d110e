/** Writes boolean expressions over bits, in the shape that reads back to the same expression. */
import { type BitExpression, bitName, type Circuit, type Register } from '../circuit/circuit.ts';

export function conditionText(circuit: Circuit, expression: BitExpression): string {
  return text(circuit, expression, false);
}

function text(circuit: Circuit, expression: BitExpression, isPart: boolean): string {
  const asRegister = registerComparison(circuit, expression);
  if (asRegister) {
    const { register, value, equal } = asRegister;
    const comparison = `${register.name} ${equal ? '==' : '!='} ${value}`;
    return isPart ? `(${comparison})` : comparison;
  }
  switch (expression.kind) {
    case 'constant':
      return expression.value ? 'true' : 'false';
    case 'bit':
      return bitName(circuit, expression.bit);
    case 'not':
      return `!${text(circuit, expression.of, true)}`;
    default: {
      const operator = { and: '&&', or: '||', xor: '^' }[expression.kind];
      const parts = expression.of.map((part) => text(circuit, part, true));
      if (parts.length === 0) return expression.kind === 'and' ? 'true' : 'false';
      const joined = parts.join(` ${operator} `);
      return isPart && parts.length > 1 ? `(${joined})` : joined;
    }
  }
}

/** A comparison of a whole register (bit 0 first) with a number, if the expression is one. */
export function registerComparison(
  circuit: Circuit,
  expression: BitExpression,
): { register: Register; value: number; equal: boolean } | undefined {
  if (expression.kind === 'not') {
    const inner = registerComparison(circuit, expression.of);
    return inner?.equal && expression.of.kind === 'and' ? { ...inner, equal: false } : undefined;
  }
  if (expression.kind !== 'and') return undefined;
  let value = 0;
  let first = -1;
  for (let k = 0; k < expression.of.length; k++) {
    const part = expression.of[k]!;
    const bit = part.kind === 'not' ? part.of : part;
    if (bit.kind !== 'bit' || (k > 0 && bit.bit !== first + k)) return undefined;
    if (k === 0) first = bit.bit;
    if (part.kind === 'bit') value += 2 ** k;
  }
  const size = expression.of.length;
  const register = circuit.bitRegisters.find((r) => r.first === first && r.size === size);
  if (!register || register.scalar || size < 2 || size > 53) return undefined;
  return { register, value, equal: true };
}

/** True when two expressions are written the same way. */
export function sameCondition(a: BitExpression | undefined, b: BitExpression | undefined): boolean {
  if (a === b) return true;
  if (!a || !b) return false;
  switch (a.kind) {
    case 'constant':
      return b.kind === 'constant' && a.value === b.value;
    case 'bit':
      return b.kind === 'bit' && a.bit === b.bit;
    case 'not':
      return b.kind === 'not' && sameCondition(a.of, b.of);
    default:
      return (
        b.kind === a.kind &&
        b.of.length === a.of.length &&
        a.of.every((part, k) => sameCondition(part, b.of[k]))
      );
  }
}
