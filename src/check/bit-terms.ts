/**
 * Puts expressions for bits into other expressions, without letting them grow.
 *
 * A program may write `c[0] = c[0] ^ c[1]; c[1] = c[1] ^ c[0];` many times over: written out in measured qubits, each round
 * doubles the text. Parities are kept as sets (what occurs twice cancels), constants are worked in, and what has become long but
 * reads few bits is written anew as a list of the cases in which it holds.
 * Limit: `TERMS_MAX` terms, InputError `too-large` beyond.
 */
import { type BitExpression, bitsOf, evaluateBits } from '../circuit/circuit.ts';
import { InputError } from '../input-error.ts';

export const TERMS_MAX = 2000;
/** Up to this many bits a long expression is written as a list of cases: at most 256 of them, of 17 terms each. */
const CASE_BITS_MAX = 8;

type Kind = 'and' | 'or' | 'xor';

/** Terms of the expressions that were made here. */
const sizes = new WeakMap<BitExpression, number>();

function sizeOf(expression: BitExpression): number {
  if (expression.kind === 'bit' || expression.kind === 'constant') return 1;
  const known = sizes.get(expression);
  if (known !== undefined) return known;
  const parts = expression.kind === 'not' ? [expression.of] : expression.of;
  const size = parts.reduce((sum, part) => sum + sizeOf(part), 1);
  sizes.set(expression, size);
  return size;
}

/** The expression with every bit replaced by what it stands for. */
export function substituted(
  expression: BitExpression,
  meaning: (bit: number) => BitExpression,
): BitExpression {
  switch (expression.kind) {
    case 'constant':
      return expression;
    case 'bit':
      return meaning(expression.bit);
    case 'not':
      return negated(substituted(expression.of, meaning));
    default:
      return combined(
        expression.kind,
        expression.of.map((part) => substituted(part, meaning)),
      );
  }
}

export function negated(expression: BitExpression): BitExpression {
  if (expression.kind === 'constant') return { kind: 'constant', value: !expression.value };
  return expression.kind === 'not' ? expression.of : { kind: 'not', of: expression };
}

/** The parts taken together, no longer than the limit. */
export function combined(kind: Kind, parts: readonly BitExpression[]): BitExpression {
  if (kind === 'xor') return parityOf(parts) ?? bounded({ kind, of: parts });
  // "and" ends with the first false part, "or" with the first true one
  const isEnd = (part: BitExpression): boolean =>
    part.kind === 'constant' && part.value === (kind === 'or');
  const end = parts.find(isEnd);
  if (end) return end;
  const rest = parts.filter((part) => part.kind !== 'constant');
  if (rest.length === 0) return { kind: 'constant', value: kind === 'and' };
  return rest.length === 1 ? rest[0]! : bounded({ kind, of: rest });
}

/** The parity of bits as bits that occur once each, and a constant; null when a part is none. */
function parityOf(parts: readonly BitExpression[]): BitExpression | null {
  const odd = new Set<number>();
  let isFlipped = false;
  const add = (part: BitExpression): boolean => {
    switch (part.kind) {
      case 'constant':
        isFlipped = isFlipped !== part.value;
        return true;
      case 'bit':
        if (!odd.delete(part.bit)) odd.add(part.bit);
        return true;
      case 'not':
        isFlipped = !isFlipped;
        return add(part.of);
      case 'xor':
        return part.of.every(add);
      default:
        return false;
    }
  };
  if (!parts.every(add)) return null;
  const bits = [...odd].sort((a, b) => a - b).map((bit): BitExpression => ({ kind: 'bit', bit }));
  const parity: BitExpression =
    bits.length > 1 ? { kind: 'xor', of: bits } : (bits[0] ?? { kind: 'constant', value: false });
  return isFlipped ? negated(parity) : parity;
}

function bounded(expression: BitExpression & { kind: Kind }): BitExpression {
  if (sizeOf(expression) <= TERMS_MAX) return expression;
  const bits = [...new Set(expression.of.flatMap((part) => bitsOf(part)))];
  if (bits.length > CASE_BITS_MAX) {
    throw new InputError({
      code: 'too-large',
      message: `a condition of more than ${TERMS_MAX} terms when it is written in measured qubits; ${TERMS_MAX} is the limit here`,
    });
  }
  const cases: BitExpression[] = [];
  for (let state = 0; state < 2 ** bits.length; state++) {
    const isOne = (bit: number): boolean => ((state >> bits.indexOf(bit)) & 1) === 1;
    if (!evaluateBits(expression, isOne)) continue;
    const all = bits.map((bit): BitExpression => {
      const here: BitExpression = { kind: 'bit', bit };
      return isOne(bit) ? here : { kind: 'not', of: here };
    });
    cases.push(all.length === 1 ? all[0]! : { kind: 'and', of: all });
  }
  return cases.length === 0 ? { kind: 'constant', value: false } : { kind: 'or', of: cases };
}
