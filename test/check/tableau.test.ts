import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { bitPairs } from '../../src/check/observation.ts';
import { compareTableaus } from '../../src/check/tableau.ts';
import { type Circuit, emptyCircuit, gate, type Operation } from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import type { ContractOptions } from '../../src/contract.ts';
import { type Random, random } from '../../src/numeric/random.ts';

const whole = (draw: Random, k: number): number => Math.min(k - 1, Math.floor(k * draw()));
const ONE = ['h', 's', 'sdg', 'x', 'y', 'z', 'sx'];
const TWO = ['cx', 'cy', 'cz', 'swap', 'iswap', 'ecr'];

function cliffords(n: number, length: number, draw: Random): Operation[] {
  return Array.from({ length }, () => {
    const a = whole(draw, n);
    if (n === 1 || draw() < 0.5) return gate(ONE[whole(draw, ONE.length)]!, [a]);
    return gate(TWO[whole(draw, TWO.length)]!, [a, (a + 1 + whole(draw, n - 1)) % n]);
  });
}

const inverse = (operations: readonly Operation[]): Operation[] => {
  const turned: { [name: string]: string } = { s: 'sdg', sdg: 's', sx: 'sxdg', iswap: 'iswapdg' };
  return [...operations]
    .reverse()
    .map((o) => (o.kind === 'gate' ? { ...o, name: turned[o.name] ?? o.name } : o));
};

function measuredAt(n: number, operations: readonly Operation[]): Circuit {
  const ends = Array.from(
    { length: n },
    (_, k): Operation => ({ kind: 'measure', wire: k, bit: k }),
  );
  return { ...emptyCircuit(n, n), operations: [...operations, ...ends] };
}

const tableau = (a: Circuit, b: Circuit, options: ContractOptions = {}) =>
  compareTableaus(a, b, contractOf(a, options), bitPairs(a, b));

test('2,000 random pairs: the tableau and the dense road agree', () => {
  let same = 0;
  for (let seed = 0; seed < 2000; seed++) {
    const draw = random(seed, 'clifford');
    const n = 1 + whole(draw, 4);
    const base = cliffords(n, 8, draw);
    // half the pairs are equal: a word and its inverse are put in; the others have one gate too many
    const word = cliffords(n, 3, draw);
    const other = seed % 2 ? [...base.slice(0, 4), ...word, ...inverse(word), ...base.slice(4)] : [...base, ...cliffords(n, 1, draw)]; // biome-ignore format: one choice
    const isProgram = seed % 3 === 0;
    const make = (list: Operation[]): Circuit => isProgram ? measuredAt(n, list) : { ...emptyCircuit(n), operations: list }; // biome-ignore format: one choice
    const options: ContractOptions =
      seed % 5 === 0 ? { inputs: 'any' } : seed % 7 === 0 ? { inputs: 'zero' } : seed % 11 === 0 ? { outputs: 'measured' } : {}; // biome-ignore format: one choice
    const [a, b] = [make(base), make(other)];
    const found = tableau(a, b, options);
    const dense = compareCircuits(a, b, { contract: options });
    if (!found || found.isSame !== (dense.verdict === 'same')) {
      throw new Error(`seed ${seed}: tableau ${found?.isSame}, dense ${dense.verdict}`);
    }
    if (found.isSame) same++;
    else expect(found.witness).not.toBeNull();
  }
  expect(same).toBeGreaterThan(900);
  expect(same).toBeLessThan(1800);
}, 120_000);

/** Gates, measurements in the middle, resets, and Pauli gates on parities of bits. */
function dynamic(n: number, length: number, draw: Random): Operation[] {
  const written: number[] = [];
  return Array.from({ length }, (): Operation => {
    const r = draw();
    const wire = whole(draw, n);
    if (r < 0.2) {
      const bit = whole(draw, n);
      written.push(bit);
      return { kind: 'measure', wire, bit };
    }
    if (r < 0.3) return { kind: 'reset', wire };
    if (r < 0.45 && written.length > 0) {
      const of = [...new Set(written.slice(-2))].map((bit) => ({ kind: 'bit', bit }) as const);
      const condition = of.length === 1 ? of[0]! : ({ kind: 'xor', of } as const);
      return { ...gate(draw() < 0.5 ? 'x' : 'z', [wire]), condition };
    }
    return cliffords(n, 1, draw)[0]!;
  });
}

test('600 pairs with measurements and resets in the middle: both roads agree', () => {
  const met = { same: 0, different: 0, left: 0 };
  for (let seed = 0; seed < 600; seed++) {
    const draw = random(seed, 'dynamic');
    const n = 2 + whole(draw, 2);
    const base = dynamic(n, 7, draw);
    const word = cliffords(n, 2, draw);
    const at = whole(draw, base.length);
    const added = seed % 2 ? [...word, ...inverse(word)] : cliffords(n, 1, draw);
    const [a, b] = [base, [...base.slice(0, at), ...added, ...base.slice(at)]].map((list) => measuredAt(n, list)); // biome-ignore format: a pair
    const found = tableau(a!, b!);
    const dense = compareCircuits(a!, b!);
    if (!found) met.left++;
    else {
      if (found.isSame !== (dense.verdict === 'same')) {
        throw new Error(`seed ${seed}: tableau ${found.isSame}, dense ${dense.verdict}`);
      }
      met[found.isSame ? 'same' : 'different']++;
    }
  }
  expect(met.same).toBeGreaterThan(250);
  expect(met.different).toBeGreaterThan(60);
  expect(met.left).toBeLessThan(60);
});

describe('any size', () => {
  test('200 wires, 20,000 gates: proved the same, and one Z more is a difference', () => {
    const draw = random(1, 'large');
    const n = 200;
    const base = cliffords(n, 10_000, draw);
    const word = cliffords(n, 5000, draw);
    const a = { ...emptyCircuit(n), operations: base };
    const b = { ...emptyCircuit(n), operations: [...word, ...inverse(word), ...base] };
    expect(tableau(a, b)).toMatchObject({ isSame: true, generators: 2 * n });
    const c = { ...b, operations: [...b.operations, gate('z', [17])] };
    const found = tableau(a, c)!;
    expect(found.isSame).toBe(false);
    const { probabilityOriginal: p, probabilityRewritten: q } = found.witness!;
    expect(Math.abs(p - q)).toBeGreaterThan(0.4);
  });

  test('bits that are never written are no hindrance', () => {
    const draw = random(3, 'bits');
    const list = [...cliffords(40, 200, draw), { kind: 'measure', wire: 3, bit: 5 } as const];
    const a = { ...emptyCircuit(40, 9), operations: list };
    const b = { ...a, operations: [gate('h', [7]), gate('h', [7]), ...list] };
    expect(tableau(a, b)).toMatchObject({ isSame: true });
  });

  test('a gate that is no Clifford gate is left to other roads', () => {
    const a = { ...emptyCircuit(2), operations: [gate('t', [0])] };
    expect(tableau(a, a)).toBeNull();
  });

  test('compare takes this road for large programs', () => {
    const n = 40;
    const draw = random(2, 'program');
    const base = cliffords(n, 300, draw);
    const word = cliffords(n, 60, draw);
    const report = compareCircuits(
      measuredAt(n, base),
      measuredAt(n, [...base.slice(0, 150), ...word, ...inverse(word), ...base.slice(150)]),
    );
    expect(report.verdict).toBe('same');
    expect(report.proof).toBe(true);
  });
});
