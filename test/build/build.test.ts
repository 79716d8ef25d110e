import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { buildTarget } from '../../src/build.ts';
import {
  type Circuit,
  circuitOfUnitary,
  emptyCircuit,
  type GateOperation,
  gate,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { freeRunning } from '../../src/control.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';
import { shannonCount } from '../../src/native/shannon.ts';
import { dimensionBound } from '../../src/native/wanted.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { readMatrixMarket } from '../../src/read/matrix-market.ts';

const runJobs = inProcess(jobTable);
const LINE: [number, number][] = [
  [0, 1],
  [1, 2],
];

function reference(name: string): Circuit {
  const text = readFileSync(
    new URL(`../../reference-unitaries/${name}.mtx`, import.meta.url),
    'utf8',
  );
  const { matrix, rows } = readMatrixMarket(text, name);
  return circuitOfUnitary(matrix, Math.log2(rows), name);
}

function pairsOf({ operations }: Circuit): (readonly number[])[] {
  return operations.flatMap((o) => (o.kind === 'gate' && o.wires.length === 2 ? [o.wires] : []));
}

describe('whole unitaries', () => {
  // published and found counts: see reference-unitaries/manifest.json for the source of each
  test.each([
    ['swap', 3],
    ['sqrt-iswap', 2],
    ['b-gate', 2],
    ['fourier-2', 3],
    ['haar-2', 3],
    ['relative-phase-toffoli', 3],
    ['peres', 5],
    ['haar-3', 14],
    ['cccz', 14],
  ])('%s takes %i CX', async (name, count) => {
    const target = reference(name);
    const { report, circuit } = await buildTarget(target, { runJobs });
    expect(report.verdict).toBe('built');
    expect(report.entanglers.used).toBe(count);
    expect(pairsOf(circuit)).toHaveLength(count);
    // the report's distance is that of the gates handed back
    const { distance } = hilbertSchmidtDistance(circuitUnitary(target), circuitUnitary(circuit));
    expect(distance).toBeLessThan(1e-20);
    expect(report.distance.hilbertSchmidt).toBeLessThan(1e-20);
  });

  test('links are respected: the relative-phase Toffoli with its target at an end takes 5 on a line', async () => {
    const { report, circuit } = await buildTarget(reference('relative-phase-toffoli'), {
      runJobs,
      links: LINE,
    });
    expect(report.entanglers).toMatchObject({ used: 5, boundKind: 'exhausted below' });
    for (const pair of pairsOf(circuit)) expect([...pair].sort().join()).toMatch(/^(0,1|1,2)$/);
  });

  test('an entangler of another class is fitted: two B gates make any two-wire gate', async () => {
    // Zhang, Vala, Sastry, Whaley, PRL 93, 020502 (2004)
    const target = circuitOfUnitary(haarUnitary(4, random(11)), 2, 'haar');
    const { report } = await buildTarget(target, { runJobs, native: 'b,u3' });
    expect(report.entanglers.used).toBe(2);
    expect(report.distance.hilbertSchmidt).toBeLessThan(1e-12);
  });

  test('fewer entanglers than needed: the best fit, and the frontier', async () => {
    const { report } = await buildTarget(reference('toffoli'), { runJobs, entanglers: 4 });
    expect(report.verdict).toBe('approximate');
    expect(report.entanglers.used).toBeLessThanOrEqual(4);
    const distances = report.frontier.map(({ distance }) => distance);
    expect(distances.length).toBeGreaterThan(2);
    expect(Math.min(...distances)).toBeGreaterThan(1e-3);
  });

  test('a circuit as written is never made longer', async () => {
    const operations = [
      gate('cx', [0, 1]),
      gate('rz', [1], 0.3),
      gate('cx', [1, 2]),
      gate('h', [2]),
    ];
    const target = { ...emptyCircuit(3), operations };
    expect((await buildTarget(target, { runJobs })).report.entanglers.used).toBe(2);
  });
});

describe('structure of bare matrices', () => {
  const unitary = (operations: readonly GateOperation[], wires: number): Circuit =>
    circuitOfUnitary(circuitUnitary({ ...emptyCircuit(wires), operations }), wires, 'target');
  const draw = random(8, 'structured');
  const haar = (n: number, wires: number[]): GateOperation =>
    unitaryGate(haarUnitary(2 ** n, draw), wires);
  const shift = (n: number): Circuit =>
    unitary(
      Array.from({ length: n - 1 }, (_, k) => gate('swap', [k, k + 1])),
      n,
    );

  test.each([
    // two Haar pairs, three CX each (Shende, Bullock, Markov, PRA 70, 012310 (2004))
    [
      'factors',
      unitary([haar(2, [0, 3]), haar(2, [1, 2])], 4),
      6,
      'a product of factors on 0,3 | 1,2',
    ],
    [
      'a factor of three wires',
      unitary([haar(3, [0, 2, 4]), haar(2, [3, 1])], 5),
      17,
      'a product of factors on 0,2,4 | 1,3',
    ],
    // 3 (n - 1): arXiv:2408.07898
    ['a cyclic shift', shift(4), 9, 'a permutation of basis states, up to phases'],
    ['a cyclic shift', shift(6), 15, 'a permutation of basis states, up to phases'],
    [
      'a controlled single-wire gate',
      unitary([{ ...haar(1, [3, 0]), controls: [true] }], 4),
      2,
      'a product of factors on 0,3 | 1 | 2',
    ],
    // phases on products of qubits: Bullock, Markov, QIC 4, 27 (2004)
    [
      'a diagonal',
      unitary(
        [
          gate('cp', [0, 1], 0.3),
          gate('rzz', [1, 4], 0.2),
          gate('rzz', [4, 2], 1),
          gate('rzz', [3, 2], 1),
        ],
        5,
      ),
      8,
      'diagonal',
    ],
    [
      'one control of two gates',
      unitary(
        [
          { ...haar(1, [2, 0]), controls: [true] },
          { ...haar(1, [2, 1]), controls: [true] },
          haar(1, [2]),
          haar(1, [3]),
          gate('cz', [2, 3]),
        ],
        4,
      ),
      5,
      'selects what happens to the others',
    ],
  ] as [string, Circuit, number, string][])('%s', async (_, target, count, note) => {
    const { report, circuit } = await buildTarget(target, { runJobs });
    expect(report.verdict).toBe('built');
    expect(report.entanglers.used).toBeLessThanOrEqual(count);
    expect(report.notes.join()).toContain(note);
    const { distance } = hilbertSchmidtDistance(circuitUnitary(target), circuitUnitary(circuit));
    expect(distance).toBeLessThan(1e-20);
  });
});

describe('more wires', () => {
  test('6 wires: shorter than the decomposition, and exact', async () => {
    const target = circuitOfUnitary(haarUnitary(64, random(6)), 6, 'haar');
    const before = shannonCount(6);
    // enough for a part of the windows
    let asked = 0;
    const control = { ...freeRunning, stopped: () => ++asked > 400 };
    const { report, circuit } = await buildTarget(target, { runJobs, control });
    expect(report.verdict).toBe('built');
    expect(report.notes.join()).toContain('stopped before every window was tried');
    expect(report.entanglers.used).toBeLessThanOrEqual(before);
    const { distance } = hilbertSchmidtDistance(circuitUnitary(target), circuitUnitary(circuit));
    expect(distance).toBeLessThan(1e-20);
  });

  test('on a line every entangler is on a link', async () => {
    const links = [0, 1, 2, 3, 4].map((k): [number, number] => [k, k + 1]);
    const operations = [gate('ccx', [0, 3, 5]), gate('cp', [1, 4], 0.7)];
    const target = circuitOfUnitary(circuitUnitary({ ...emptyCircuit(6), operations }), 6, 'far');
    const { report, circuit } = await buildTarget(target, { runJobs, links });
    expect(report.verdict).toBe('built');
    for (const [a, b] of pairsOf(circuit)) expect(Math.abs(a! - b!)).toBe(1);
    const { distance } = hilbertSchmidtDistance(circuitUnitary(target), circuitUnitary(circuit));
    expect(distance).toBeLessThan(1e-20);
  });

  test('fewer entanglers than an exact decomposition has are no result', async () => {
    const target = circuitOfUnitary(haarUnitary(64, random(6)), 6, 'haar');
    const control = { ...freeRunning, stopped: () => true };
    const { report } = await buildTarget(target, { runJobs, control, entanglers: 10 });
    expect(report.verdict).toBe('undecided');
  });
});

describe('the class of a two-wire target', () => {
  // Makhlin, Quantum Inf. Process. 1, 243 (2002); the coordinates of Zhang, Vala, Sastry, Whaley, PRA 67, 042313 (2003)
  test.each([
    ['swap', [1, 1, 1], [-1, 0, -3]],
    ['b-gate', [1, 0.5, 0], [0, 0, 0]],
    ['sqrt-iswap', [0.5, 0.5, 0], [0.25, 0, 1]],
    ['fourier-2', [1, 1, 0.5], [-0.5, 0, -2]],
  ])('%s', async (name, coordinates, makhlin) => {
    const { canonical } = (await buildTarget(reference(name), { runJobs })).report;
    coordinates.forEach((c, k) => {
      expect(canonical!.coordinates[k]).toBeCloseTo(c, 12);
    });
    makhlin.forEach((g, k) => {
      expect(canonical!.makhlin[k]).toBeCloseTo(g, 12);
    });
  });

  test('others have none', async () => {
    expect((await buildTarget(reference('peres'), { runJobs })).report.canonical).toBeNull();
  });
});

describe('states and isometries', () => {
  // Znidaric, Giraud, Georgeot, PRA 77, 032320 (2008): 3 CX for states of 3 wires
  test.each([
    [2, 1],
    [3, 3],
    [4, 6],
  ])('a random state on %i wires takes %i CX', async (n, count) => {
    const target = circuitOfUnitary(haarUnitary(2 ** n, random(n, 'state')), n, 'state');
    const { report, circuit } = await buildTarget(target, { runJobs, inputs: 'zero' });
    expect(report.entanglers.used).toBe(count);
    expect(report.contract).toBe('zero/kept');
    // column 0 agrees up to a phase
    const [u, v] = [circuitUnitary(target), circuitUnitary(circuit)];
    const d = 2 ** n;
    let [re, im] = [0, 0];
    for (let r = 0; r < d; r++) {
      re += u[r * d]! * v[r * d]! + u[d * d + r * d]! * v[d * d + r * d]!;
      im += u[r * d]! * v[d * d + r * d]! - u[d * d + r * d]! * v[r * d]!;
    }
    expect(Math.hypot(re, im)).toBeCloseTo(1, 12);
  });

  test('an isometry from one wire to three takes 5 CX, whichever wires start in |0>', async () => {
    const target = circuitOfUnitary(haarUnitary(8, random(4, 'isometry')), 3, 'isometry');
    const inputOf = new Map([
      [0, 'zero'],
      [2, 'zero'],
    ] as const);
    const { report } = await buildTarget(target, { runJobs, inputOf });
    expect(report.entanglers.used).toBe(5);
    expect(report.distance.hilbertSchmidt).toBeLessThan(1e-20);
  });

  test('bounds by counting, as published', () => {
    // Shende, Markov, Bullock (2004) and Iten et al., PRA 93, 032318 (2016)
    expect([2, 3, 4, 5].map((n) => dimensionBound(n, 2 ** n, 4))).toEqual([3, 14, 61, 252]);
    expect([2, 3, 4, 5].map((n) => dimensionBound(n, 1, 4))).toEqual([1, 2, 6, 13]);
    expect([dimensionBound(3, 2, 4), dimensionBound(3, 4, 4)]).toEqual([5, 10]);
    expect([dimensionBound(4, 2, 4), dimensionBound(4, 4, 4)]).toEqual([13, 26]);
  });
});

test('the same seed gives the same gates', async () => {
  const target = circuitOfUnitary(haarUnitary(8, random(21)), 3, 'haar');
  const [one, two] = await Promise.all([0, 1].map(() => buildTarget(target, { runJobs, seed: 5 })));
  expect(one!.circuit.operations).toEqual(two!.circuit.operations);
});

test('links that leave a wire alone are refused', async () => {
  const target = reference('toffoli');
  await expect(buildTarget(target, { runJobs, links: [[0, 1]] })).rejects.toThrow(
    'expected links that connect all 3 wires, got 0-1',
  );
  const [first] = target.operations as GateOperation[];
  expect(first!.wires).toHaveLength(3);
});
