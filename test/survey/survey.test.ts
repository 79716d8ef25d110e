import { describe, expect, test } from 'vitest';
import {
  type Circuit,
  circuitOfUnitary,
  emptyCircuit,
  gate,
  type Operation,
} from '../../src/circuit/circuit.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { surveyCircuit } from '../../src/survey/survey.ts';

const measure = (wire: number, bit = wire): Operation => ({ kind: 'measure', wire, bit });
const of = (wires: number, operations: readonly Operation[], bits = 0): Circuit => ({
  ...emptyCircuit(wires, bits),
  operations,
});
const row = (report: ReturnType<typeof surveyCircuit>, contract: string) =>
  report.widths.find((entry) => entry.contract === contract);

describe('survey', () => {
  test('a line of gates: width 2, and its pairs', () => {
    const report = surveyCircuit(
      of(
        4,
        [0, 1, 2].map((k) => gate('rxx', [k, k + 1], 0.3 + k)),
      ),
    );
    // as written each wire waits for the ones before it
    expect(report.structure.width).toBe(2);
    expect(report.structure.reach[0]).toEqual([true, true, false, false]);
    expect(report.structure.pairs).toContainEqual({ leaves: 0, enters: 2 });
    expect(report.structure.how).toBe('exact');
    expect(report.contract).toBe('any/kept');
    expect(report.contractFromFile).toBe(true);
    expect(report.counts.twoQubit).toBe(3);
    expect(row(report, 'any/kept')).toMatchObject({ width: 2, how: 'exact' });
  });

  test('gate after gate that comes to nothing: an opening', () => {
    const there = [gate('cx', [0, 2]), gate('h', [2]), gate('cx', [1, 2])];
    const back = [gate('h', [2]), gate('cx', [0, 2])];
    const operations = [...there, gate('cx', [1, 2]), ...back, gate('cx', [0, 1])];
    const report = surveyCircuit(of(3, operations));
    expect(report.structure.width).toBe(3);
    expect(report.causal?.width).toBe(2);
    expect(report.openings).toContainEqual({ leaves: 0, enters: 2 });
    expect(report.openings.length).toBe(4);
  });

  test('a generic unitary has no pair, and fewer wires have their price', () => {
    const report = surveyCircuit(circuitOfUnitary(haarUnitary(16, random('survey')), 4, 'generic'));
    expect(report.causal?.width).toBe(4);
    expect(report.openings).toEqual([]);
    expect(row(report, 'any/kept')).toMatchObject({ width: 4, how: 'exact' });
    expect(report.approximate?.map(({ wires }) => wires)).toEqual([3, 2, 1]);
    const prices = report.approximate!.map(({ infidelityAtLeast }) => infidelityAtLeast);
    expect(prices[0]).toBeGreaterThan(0.1);
    expect([...prices].sort((a, b) => a - b)).toEqual(prices);
  });

  test('the Fourier transform: every wire as kept, one as measured', () => {
    const n = 4;
    const gates: Operation[] = [];
    for (let k = 0; k < n; k++) {
      gates.push(gate('h', [k]));
      for (let j = k + 1; j < n; j++) gates.push(gate('cp', [j, k], Math.PI / 2 ** (j - k)));
    }
    const block = surveyCircuit(of(n, gates));
    expect(row(block, 'any/kept')).toMatchObject({ width: n, how: 'exact' });
    expect(row(block, 'any/measured')).toMatchObject({ width: 1, how: 'exact' });
    const ends = Array.from({ length: n }, (_, k) => measure(k));
    const program = surveyCircuit(of(n, [...gates, ...ends], n));
    expect(program.contract).toBe('program');
    expect(program.influence?.kind).toBe('measured');
    expect(program.early).toMatchObject({ width: 1 });
    expect(row(program, 'program')).toMatchObject({ width: 1 });
    expect(program.causal?.width).toBe(1);
  });

  // bond dimension 2: Schoen et al., PRL 95, 110503 (2005)
  test('a GHZ chain and a linear cluster from |0...0>: two wires', () => {
    const n = 6;
    const ghz = [
      gate('h', [0]),
      ...Array.from({ length: n - 1 }, (_, k) => gate('cx', [0, k + 1])),
    ];
    expect(row(surveyCircuit(of(n, ghz)), 'zero/kept')).toMatchObject({ width: 2, how: 'exact' });
    const cluster = [
      ...Array.from({ length: n }, (_, k) => gate('h', [k])),
      ...Array.from({ length: n - 1 }, (_, k) =>
        gate('cz', [(3 * k) % (n - 1), ((3 * k) % (n - 1)) + 1]),
      ),
    ];
    expect(row(surveyCircuit(of(n, cluster)), 'zero/kept')).toMatchObject({ width: 2 });
  });

  test('fewer wires for a state have their price: Eckart, Young', () => {
    // cos |00> + sin |11> on one wire is a product state: infidelity sin^2 at best
    const t = 0.3;
    const report = surveyCircuit(of(2, [gate('ry', [0], 2 * t), gate('cx', [0, 1])]));
    const why = row(report, 'zero/kept')!.why;
    expect(row(report, 'zero/kept')!.width).toBe(2);
    expect(why).toContain(`one wire: infidelity at least ${(Math.sin(t) ** 2).toPrecision(3)}`);
  });

  test('a W state from |0...0>: two wires', () => {
    const n = 5;
    const operations: Operation[] = [gate('x', [0])];
    for (let k = 0; k < n - 1; k++) {
      operations.push(gate('cry', [k, k + 1], 2 * Math.acos(Math.sqrt(1 / (n - k)))));
      operations.push(gate('cx', [k + 1, k]));
    }
    expect(row(surveyCircuit(of(n, operations)), 'zero/kept')).toMatchObject({ width: 2 });
  });

  test('measuring and resetting on the way: structure only, said so', () => {
    const operations: Operation[] = [
      gate('cx', [0, 1]),
      measure(1, 0),
      { kind: 'reset', wire: 1 },
      gate('cx', [2, 1]),
      measure(1, 1),
      { ...gate('x', [2]), condition: { kind: 'bit', bit: 0 } },
      measure(0, 2),
    ];
    const report = surveyCircuit(of(3, operations, 3));
    expect(report.influence).toBeNull();
    expect(report.causal).toBeNull();
    expect(report.notes.some((note) => note.startsWith('no influence table'))).toBe(true);
    expect(report.structure.width).toBe(2);
    // after the reset wire 1 carries nothing of input 0, but wire 2 does, by its condition
    expect(report.structure.reach[1]![0]).toBe(false);
    expect(report.structure.reach[2]![0]).toBe(true);
  });

  test('twelve wires: probes, said so', () => {
    const n = 12;
    const report = surveyCircuit(
      of(
        n,
        Array.from({ length: n - 1 }, (_, k) => gate('cx', [k, k + 1])),
      ),
    );
    expect(report.influence?.method).toBe('probes');
    expect(report.notes.some((note) => note.includes('probes'))).toBe(true);
    expect(report.causal?.width).toBe(2);
  });

  test('thirty wires with planted words: windows find the openings, said so', () => {
    const n = 30;
    const operations: Operation[] = [];
    for (let k = 0; k + 1 < n; k++) {
      operations.push(gate('rxx', [k, k + 1], 0.4), gate('ry', [k], 0.3), gate('ry', [k + 1], 0.2));
      if (k % 7 !== 3) continue;
      const far = (k + 11) % n;
      // four of them make a CX from k to far; with the fifth nothing is left
      for (const pair of [
        [k, k + 1],
        [k + 1, far],
        [k, k + 1],
        [k + 1, far],
        [k, far],
      ]) {
        operations.push(gate('cx', pair));
      }
    }
    const report = surveyCircuit(of(n, operations));
    expect(report.structure.width).toBeGreaterThan(3);
    expect(report.causal?.width).toBe(2);
    expect(report.causal?.how).toBe('upper');
    expect(report.openings.length).toBeGreaterThan(10);
    expect(row(report, 'any/kept')).toMatchObject({ width: 2, how: 'upper' });
    expect(report.notes.some((note) => note.includes('windows'))).toBe(true);
  });

  test('no wires, one wire', () => {
    expect(surveyCircuit(of(0, [])).widths.length).toBeGreaterThan(0);
    expect(surveyCircuit(of(1, [gate('h', [0])])).structure.width).toBe(1);
  });
});
