/**
 * Builds boolean expressions over bits; constants vanish on the way. The shape follows the text (nothing
 * else is simplified), so that what is written reads back to the same expression.
 */
import type { BitExpression } from '../circuit/circuit.ts';

const FALSE: BitExpression = Object.freeze({ kind: 'constant', value: false });
const TRUE: BitExpression = Object.freeze({ kind: 'constant', value: true });

export function negated(of: BitExpression): BitExpression {
  if (of.kind === 'constant') return of.value ? FALSE : TRUE;
  return of.kind === 'not' ? of.of : { kind: 'not', of };
}

export function allOf(parts: readonly BitExpression[]): BitExpression {
  if (parts.some((p) => p.kind === 'constant' && !p.value)) return FALSE;
  const rest = parts.filter((p) => p.kind !== 'constant');
  return rest.length === 0 ? TRUE : rest.length === 1 ? rest[0]! : { kind: 'and', of: rest };
}

export function anyOf(parts: readonly BitExpression[]): BitExpression {
  if (parts.some((p) => p.kind === 'constant' && p.value)) return TRUE;
  const rest = parts.filter((p) => p.kind !== 'constant');
  return rest.length === 0 ? FALSE : rest.length === 1 ? rest[0]! : { kind: 'or', of: rest };
}

/** True when an odd number of the parts is. */
export function oddOf(parts: readonly BitExpression[]): BitExpression {
  const flip = parts.filter((p) => p.kind === 'constant' && p.value).length % 2 === 1;
  const rest = parts.filter((p) => p.kind !== 'constant');
  if (rest.length === 0) return flip ? TRUE : FALSE;
  const sum: BitExpression = rest.length === 1 ? rest[0]! : { kind: 'xor', of: rest };
  return flip ? negated(sum) : sum;
}

export function bitEquals(bit: BitExpression, value: boolean): BitExpression {
  return value ? bit : negated(bit);
}

/** All bits of a register (least significant first) agree with a number. */
export function registerEquals(bits: readonly BitExpression[], number: number): BitExpression {
  return allOf(bits.map((bit, k) => bitEquals(bit, Math.floor(number / 2 ** k) % 2 === 1)));
}

/** Compares two registers of one length as unsigned numbers. */
export function compareBits(
  op: string,
  left: readonly BitExpression[],
  right: readonly BitExpression[],
): BitExpression {
  const agree = left.map((bit, k) => negated(oddOf([bit, right[k]!])));
  switch (op) {
    case '==':
      return allOf(agree);
    case '!=':
      return negated(allOf(agree));
    case '<':
      return anyOf(left.map((bit, k) => allOf([negated(bit), right[k]!, ...agree.slice(k + 1)])));
    case '>':
      return compareBits('<', right, left);
    case '<=':
      return negated(compareBits('<', right, left));
    default:
      return negated(compareBits('<', left, right));
  }
}
