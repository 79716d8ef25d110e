import { describe, expect, test } from 'vitest';
import { combined, negated, substituted } from '../../src/check/bit-terms.ts';
import { compareCircuits } from '../../src/check/compare.ts';
import { type BitExpression, evaluateBits } from '../../src/circuit/circuit.ts';
import { random } from '../../src/numeric/random.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const draw = random(77);
const below = (n: number): number => Math.floor(draw() * n);

function randomExpression(bits: number, depth: number): BitExpression {
  const kind = below(depth > 0 ? 7 : 2);
  if (kind === 0) return { kind: 'constant', value: draw() < 0.5 };
  if (kind < 3) return { kind: 'bit', bit: below(bits) };
  const inner = (): BitExpression => randomExpression(bits, depth - 1);
  if (kind === 3) return { kind: 'not', of: inner() };
  const of = Array.from({ length: 1 + below(4) }, inner);
  return { kind: (['and', 'or', 'xor'] as const)[kind - 4]!, of };
}

const sizeOf = (e: BitExpression): number =>
  e.kind === 'bit' || e.kind === 'constant'
    ? 1
    : 1 + (e.kind === 'not' ? sizeOf(e.of) : e.of.reduce((sum, part) => sum + sizeOf(part), 0));

test('500 random expressions of random values mean what they say (seed 77)', () => {
  for (let round = 0; round < 500; round++) {
    const outer = randomExpression(4, 4);
    const inner = Array.from({ length: 4 }, () => randomExpression(5, 2));
    const whole = substituted(outer, (bit) => inner[bit]!);
    for (let state = 0; state < 32; state++) {
      const bit = (k: number): boolean => ((state >> k) & 1) === 1;
      const plain = evaluateBits(outer, (k) => evaluateBits(inner[k]!, bit));
      expect(evaluateBits(whole, bit)).toBe(plain);
      expect(evaluateBits(negated(whole), bit)).toBe(!plain);
    }
  }
});

describe('what is written again and again does not grow', () => {
  test('two bits that take each other in, 200 times, against plain values', () => {
    const start: BitExpression[] = [{ kind: 'bit', bit: 0 }, { kind: 'bit', bit: 1 }]; // biome-ignore format: one pair
    for (const kind of ['xor', 'and', 'or'] as const) {
      let [a, b] = start as [BitExpression, BitExpression];
      const values = [0, 1, 2, 3].map((state) => [(state & 1) === 1, state > 1] as [boolean, boolean]); // biome-ignore format: one list
      for (let k = 0; k < 200; k++) {
        a = combined('xor', [combined(kind, [a, negated(b)]), b]);
        b = combined(kind, [b, a]);
        for (const value of values) {
          const plain = (x: boolean, y: boolean): boolean =>
            kind === 'xor' ? x !== y : kind === 'and' ? x && y : x || y;
          value[0] = plain(value[0], !value[1]) !== value[1];
          value[1] = plain(value[1], value[0]);
        }
        expect(sizeOf(a) + sizeOf(b)).toBeLessThan(10_000);
      }
      values.forEach(([x, y], state) => {
        const bit = (k: number): boolean => ((state >> k) & 1) === 1;
        expect([evaluateBits(a, bit), evaluateBits(b, bit)]).toEqual([x, y]);
      });
    }
  });

  test('a program that doubles its conditions 60 times is compared; beyond the limit it is undecided', () => {
    const text = (bits: number, round: string): string =>
      `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[${bits}] q;\nbit[${bits}] c;\nh q;\nc = measure q;\nfor int i in [0:59] { ${round} }\nif (c[0]) x q[0];\nc[1] = measure q[0];`;
    const compare = (a: string) => {
      const circuit = readCircuit(a, 'doubling.qasm').circuit;
      return compareCircuits(circuit, circuit).verdict;
    };
    expect(compare(text(2, 'c[0] = c[0] && c[1] || (c[0] ^ c[1]); c[1] = c[0] ^ c[1] || c[0];'))).toBe('same'); // biome-ignore format: one check
    expect(compare(text(2, 'c[0] = c[0] ^ c[1]; c[1] = c[1] ^ c[0];'))).toBe('same');
    const many = Array.from({ length: 10 }, (_, k) => `c[${k}] = c[${k}] && c[${(k + 1) % 10}] || (c[${k}] ^ c[${(k + 3) % 10}]);`); // biome-ignore format: one list
    expect(compare(text(10, many.join(' ')))).toBe('undecided');
  });
});
