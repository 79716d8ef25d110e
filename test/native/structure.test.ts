import { describe, expect, test } from 'vitest';
import { emptyCircuit, gate, type Operation, unitaryGate } from '../../src/circuit/circuit.ts';
import { gateTable } from '../../src/circuit/gates.ts';
import { circuitUnitary, withWireOrder } from '../../src/circuit/unitary.ts';
import { factorsOf, monomialOf, type Selection, selectionOn } from '../../src/native/structure.ts';
import { fromQuarters } from '../../src/numeric/cosine-sine.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

const unitaryOf = (operations: readonly Operation[], wires: number): Float64Array =>
  circuitUnitary({ ...emptyCircuit(wires), operations });
const distance = (u: Float64Array, v: Float64Array): number =>
  hilbertSchmidtDistance(u, v).distance;
const draw = random(7, 'structure');
const haar = (n: number): Float64Array => haarUnitary(2 ** n, draw);

describe('factors', () => {
  test.each([
    ['one group', 3, [[0, 1, 2]]],
    ['three singles', 3, [[0], [1], [2]]],
    [
      'groups that interlace',
      5,
      [
        [0, 3],
        [1, 2, 4],
      ],
    ],
    [
      'three groups',
      6,
      [
        [0, 5],
        [1, 3],
        [2, 4],
      ],
    ],
    ['a pair and singles', 8, [[2, 6], [0], [1], [3], [4], [5], [7]]],
  ] as [string, number, number[][]][])('%s on %i wires come back', (_, n, groups) => {
    const u = unitaryOf(
      groups.map((wires) => unitaryGate(haar(wires.length), wires)),
      n,
    );
    const found = factorsOf(u, n);
    const names = (list: readonly (readonly number[])[]): string[] =>
      list.map((w) => w.join()).sort();
    expect(names(found.map(({ wires }) => wires))).toEqual(names(groups));
    const made = unitaryOf(
      found.map(({ wires, matrix }) => unitaryGate(matrix, wires)),
      n,
    );
    expect(distance(u, made)).toBeLessThan(1e-26);
  });

  test('a weak interaction is no product', () => {
    const u = unitaryOf([unitaryGate(haar(2), [0, 2]), gate('rzz', [1, 2], 1e-9)], 3);
    expect(factorsOf(u, 3)).toHaveLength(1);
  });
});

test('another order of wires', () => {
  const u = unitaryOf([gate('cx', [0, 2])], 3);
  // wire 2 becomes wire 0, wire 0 wire 1
  expect(withWireOrder(u, [2, 0, 1])).toEqual(unitaryOf([gate('cx', [1, 0])], 3));
});

function recomposed({ wire, a, b, g1, g2 }: Selection, n: number): Float64Array {
  const rest = Array.from({ length: n }, (_, k) => k).filter((k) => k !== wire);
  const inner = fromQuarters([g1, null, null, g2], 2 ** (n - 1));
  return unitaryOf(
    [unitaryGate(b, [wire]), unitaryGate(inner, [wire, ...rest]), unitaryGate(a, [wire])],
    n,
  );
}

describe('a wire that selects', () => {
  test.each([0, 1, 2, 3])('wire %i of 4, in its own bases', (wire) => {
    const rest = [0, 1, 2, 3].filter((k) => k !== wire);
    const inner = fromQuarters([haar(3), null, null, haar(3)], 8);
    for (const [a, b] of [
      [haar(1), haar(1)],
      [gateTable.get('h')!.matrix([]), gateTable.get('s')!.matrix([])],
      [gateTable.get('id')!.matrix([]), gateTable.get('id')!.matrix([])],
    ] as const) {
      const u = unitaryOf(
        [unitaryGate(a, [wire]), unitaryGate(inner, [wire, ...rest]), unitaryGate(b, [wire])],
        4,
      );
      const found = selectionOn(u, 4, wire)!;
      expect(distance(u, recomposed(found, 4))).toBeLessThan(1e-24);
      for (const other of rest) expect(selectionOn(u, 4, other)).toBeUndefined();
    }
  });

  test('a control, a target of X, and a swap', () => {
    const u = unitaryOf([gate('ccx', [0, 1, 2])], 3);
    for (const wire of [0, 1, 2]) {
      expect(distance(u, recomposed(selectionOn(u, 3, wire)!, 3))).toBeLessThan(1e-26);
    }
    expect(selectionOn(unitaryOf([gate('swap', [0, 1])], 3), 3, 0)).toBeUndefined();
    expect(selectionOn(haar(3), 3, 1)).toBeUndefined();
  });
});

test('a permutation with phases', () => {
  const u = unitaryOf([gate('t', [0]), gate('ccx', [0, 1, 2]), gate('cx', [2, 0])], 3);
  const { to, phases } = monomialOf(u, 3)!;
  for (let x = 0; x < 8; x++) {
    expect(u[to[x]! * 8 + x]).toBeCloseTo(Math.cos(phases[x]!), 14);
    expect(u[64 + to[x]! * 8 + x]).toBeCloseTo(Math.sin(phases[x]!), 14);
  }
  expect(new Set(to).size).toBe(8);
  expect(monomialOf(unitaryOf([gate('h', [1])], 2), 2)).toBeUndefined();
});
