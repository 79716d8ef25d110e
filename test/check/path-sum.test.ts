import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { bitPairs } from '../../src/check/observation.ts';
import { comparePathSums } from '../../src/check/path-sum.ts';
import { sidesOf } from '../../src/check/sides.ts';
import { type Circuit, emptyCircuit, type GateOperation, gate } from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import type { ContractOptions } from '../../src/contract.ts';
import { type Random, random } from '../../src/numeric/random.ts';

const whole = (draw: Random, k: number): number => Math.min(k - 1, Math.floor(k * draw()));
const block = (wires: number, operations: readonly GateOperation[]): Circuit => ({
  ...emptyCircuit(wires),
  operations: [...operations],
});

function word(n: number, length: number, draw: Random, withTurns = true): GateOperation[] {
  const fixed = ['x', 'z', 's', 't', 'tdg', ...(withTurns ? ['h', 'sx', 'y', 'h'] : [])];
  const angled = withTurns ? ['rz', 'rx', 'ry', 'p'] : ['rz', 'p'];
  return Array.from({ length }, (): GateOperation => {
    const [a, b, c] = Array.from({ length: n }, (_, k) => [draw(), k]).sort((x, y) => x[0]! - y[0]!).map((x) => x[1]!); // biome-ignore format: a shuffle
    const kind = whole(draw, 10);
    if (kind < 3) return gate(fixed[whole(draw, fixed.length)]!, [a!]);
    if (kind < 5) return gate(angled[whole(draw, angled.length)]!, [a!], 2 * draw());
    if (kind < 8) return gate('cx', [a!, b!]);
    if (kind < 9) return gate(['cz', 'swap', 'iswap', 'ch', 'cy'][whole(draw, withTurns ? 5 : 2)]!, [a!, b!]); // biome-ignore format: one gate
    if (n > 2 && draw() < 0.5) return gate(withTurns ? 'ccx' : 'ccz', [a!, b!, c!]);
    return gate(withTurns ? ['crz', 'cp', 'rzz', 'rxx', 'cry', 'crx'][whole(draw, 6)]! : 'rzz', [a!, b!], 2 * draw()); // biome-ignore format: one gate
  });
}

const turnedBack = (list: readonly GateOperation[]): GateOperation[] =>
  [...list].reverse().map((operation) => ({ ...operation, power: -operation.power }));

const sums = (a: Circuit, b: Circuit, options: ContractOptions = {}) => {
  const sides = sidesOf(a, b, contractOf(a, options), bitPairs(a, b));
  return sides && { sides, answer: comparePathSums(sides.left, sides.right, sides.lines, sides.zeroLines) }; // biome-ignore format: one answer
};

test('900 random pairs: never another answer than the dense road, and the same distance where it gives one', () => {
  const met = { same: 0, different: 0, left: 0, distances: 0 };
  for (let seed = 0; seed < 900; seed++) {
    const draw = random(seed, 'path sums');
    const n = 2 + whole(draw, 3);
    const withTurns = seed % 3 !== 0;
    const base = word(n, 8, draw, withTurns);
    const at = whole(draw, base.length + 1);
    const other = word(n, 3, draw, withTurns);
    const put = seed % 2 ? [...other, ...turnedBack(other)] : word(n, 1, draw, withTurns);
    const [a, b] = [block(n, base), block(n, [...base.slice(0, at), ...put, ...base.slice(at)])];
    const options: ContractOptions = seed % 5 === 0 ? { inputs: 'zero' } : {};
    const { answer } = sums(a, b, options)!;
    const dense = compareCircuits(a, b, { contract: options });
    if (!answer) {
      met.left++;
      continue;
    }
    const isSame = answer.hilbertSchmidt === null ? answer.isSame : answer.hilbertSchmidt < 1e-10;
    if (isSame !== (dense.verdict === 'same')) {
      throw new Error(`seed ${seed}: path sum ${JSON.stringify(answer)}, dense ${dense.verdict}`);
    }
    met[isSame ? 'same' : 'different']++;
    if (answer.hilbertSchmidt === null || options.inputs === 'zero') continue;
    met.distances++;
    expect(answer.hilbertSchmidt).toBeCloseTo(dense.distance!.hilbertSchmidt, 9);
  }
  console.log(`path sums: ${JSON.stringify(met)}`);
  expect(met.same).toBeGreaterThan(400);
  expect(met.different).toBeGreaterThan(150);
  expect(met.left).toBeLessThan(180);
}, 120_000);

describe('beyond dense size', () => {
  const n = 60;
  const ladder = (order: readonly number[], angles: readonly number[]): GateOperation[] =>
    order.flatMap((k) => [
      gate('cx', [k, k + 1]),
      gate('rz', [k + 1], angles[k]!),
      gate('cx', [k, k + 1]),
    ]);
  const angles = Array.from({ length: n }, (_, k) => 0.1 + 0.01 * k);
  const up = Array.from({ length: n - 1 }, (_, k) => k);

  test('the same phases by other CX networks (Amy, Maslov, Mosca 2014: any order of the parities)', () => {
    const a = block(n, ladder(up, angles));
    // rzz on the same pairs, and the parities in another order
    const b = block(
      n,
      [...up].reverse().map((k) => gate('rzz', [k, k + 1], angles[k]!)),
    );
    expect(compareCircuits(a, b)).toMatchObject({ verdict: 'same', proof: true });
    // one long chain of CX, each parity made once
    const chain = block(n, [
      ...up.map((k) => gate('cx', [k, k + 1])),
      ...up.map((k) => gate('rz', [k + 1], angles[k]!)),
      ...[...up].reverse().map((k) => gate('cx', [k, k + 1])),
    ]);
    const prefixes = block(n, [
      ...up.flatMap((k) => [gate('cx', [k, k + 1]), gate('rz', [k + 1], angles[k]!)]),
      ...[...up].reverse().map((k) => gate('cx', [k, k + 1])),
    ]);
    expect(compareCircuits(chain, prefixes)).toMatchObject({ verdict: 'same', proof: true });
    expect(compareCircuits(a, prefixes)).toMatchObject({ verdict: 'different', proof: true });
  });

  test('an angle off by 1e-3 among them: D = 1 - cos(0.0005), and an input that shows it', () => {
    const other = angles.map((x, k) => (k === 17 ? x + 1e-3 : x));
    const a = block(n, [...ladder(up, angles), gate('h', [3])]);
    const b = block(n, [...ladder([...up].reverse(), other), gate('h', [3])]);
    const report = compareCircuits(a, b);
    expect(report).toMatchObject({ verdict: 'different', proof: true });
    expect(report.distance!.hilbertSchmidt / (1 - Math.cos(0.0005))).toBeCloseTo(1, 6);
    expect(report.witness!.probabilityOriginal - report.witness!.probabilityRewritten).toBeCloseTo(Math.sin(0.0005) ** 2, 12); // biome-ignore format: one check
  });

  test('Toffoli gates against their Clifford+T circuits (Nielsen, Chuang 2010, Fig. 4.9), forty of them', () => {
    const draw = random(5, 'toffoli');
    const triples = Array.from({ length: 40 }, () => {
      const a = whole(draw, n - 2);
      return [a, a + 1, a + 2] as const;
    });
    const written = ([a, b, c]: readonly [number, number, number]): GateOperation[] => [
      gate('h', [c]), gate('cx', [b, c]), gate('tdg', [c]), gate('cx', [a, c]), gate('t', [c]),
      gate('cx', [b, c]), gate('tdg', [c]), gate('cx', [a, c]), gate('t', [b]), gate('t', [c]),
      gate('h', [c]), gate('cx', [a, b]), gate('t', [a]), gate('tdg', [b]), gate('cx', [a, b]),
    ]; // biome-ignore format: as in the figure
    const a = block(
      n,
      triples.map((list) => gate('ccx', list)),
    );
    const b = block(n, triples.flatMap(written));
    expect(compareCircuits(a, b)).toMatchObject({ verdict: 'same', proof: true });
    const worse = block(n, [...triples.flatMap(written), gate('t', [9])]);
    expect(compareCircuits(a, worse)).toMatchObject({ verdict: 'different', proof: true });
  });

  test('one X too many, or one H, is a difference with a basis state that does not come back', () => {
    const a = block(n, ladder(up, angles));
    for (const extra of [gate('x', [30]), gate('h', [30])]) {
      const b = block(n, [...ladder([...up].reverse(), angles), extra]);
      const report = compareCircuits(a, b);
      expect(report).toMatchObject({ verdict: 'different', proof: true });
      expect(report.witness!.probabilityRewritten).toBeLessThanOrEqual(0.5);
    }
  });
});

test('a small angle beside phases that make nothing together', () => {
  // ccz twice in different words: its parities with pi/4 and with -pi/4, which agree for every input
  const ccz = gate('ccz', [0, 1, 2]);
  const a = block(3, [ccz, gate('rz', [0], 4e-6)]);
  const words = [[0], [1], [2]].map((on) => gate('p', on, -Math.PI / 4));
  const pairs = [[0, 1], [1, 2], [0, 2]].map(([x, y]) => [gate('cx', [x!, y!]), gate('p', [y!], Math.PI / 4), gate('cx', [x!, y!])]); // biome-ignore format: one list
  const all = [gate('cx', [0, 2]), gate('cx', [1, 2]), gate('p', [2], -Math.PI / 4), gate('cx', [1, 2]), gate('cx', [0, 2])]; // biome-ignore format: one list
  const b = block(3, [...words, ...pairs.flat(), ...all]);
  const { answer } = sums(a, b)!;
  const dense = compareCircuits(a, b);
  expect(dense.verdict).toBe('same');
  expect(answer!.hilbertSchmidt! / dense.distance!.hilbertSchmidt).toBeCloseTo(1, 4);
});

test('angles of 4e-6 on parities that depend on each other: the same within the tolerance, as the dense road says', () => {
  const small = 4e-6;
  const phases = [gate('rz', [0], small), gate('rz', [1], small), gate('rzz', [0, 1], small)];
  const { answer } = sums(block(2, phases), block(2, []))!;
  const dense = compareCircuits(block(2, phases), block(2, []));
  expect(dense.verdict).toBe('same');
  expect(answer!.hilbertSchmidt! / dense.distance!.hilbertSchmidt).toBeCloseTo(1, 5);
});
