import { describe, expect, test } from 'vitest';
import {
  type Circuit,
  circuitOfUnitary,
  emptyCircuit,
  type GateOperation,
  gate,
} from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { freeRunning } from '../../src/control.ts';
import { inProcess, type RunJobs } from '../../src/jobs.ts';
import { type Narrowed, type NarrowOptions, narrow } from '../../src/narrow.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { fitBlock } from '../../src/reshape/fit-block.ts';
import { perturbed, plantedChain } from '../reshape/planted-chain.ts';
import { distanceTo, play, worstRowError } from './simulate.ts';

const runJobs: RunJobs = inProcess({ fit: fitBlock });

function run(circuit: Circuit, options: Partial<NarrowOptions> = {}): Promise<Narrowed> {
  return narrow(circuit, { runJobs, ...options });
}

function textOf({ report, text }: Narrowed): string {
  if (text === null) throw new Error(`nothing was narrowed: ${report.reason}`);
  return text;
}

function fourier(n: number): Circuit {
  const operations: GateOperation[] = [];
  for (let i = 0; i < n; i++) {
    operations.push(gate('h', [i]));
    for (let j = i + 1; j < n; j++) operations.push(gate('cp', [j, i], Math.PI / 2 ** (j - i)));
  }
  for (let i = 0; i < n >> 1; i++) operations.push(gate('swap', [i, n - 1 - i]));
  return { ...emptyCircuit(n, 0, 'fourier'), operations };
}

describe('chains given as matrices', () => {
  for (const [n, width, entanglers] of [
    [4, 3, 25],
    [4, 2, 9],
    [5, 3, 37],
    [6, 2, 15],
    [6, 3, 49],
  ] as const) {
    test(`${n} wires to ${width}: equal by another simulation, ${entanglers} CX (seed 11)`, async () => {
      const { u } = plantedChain(n, width, 11);
      const result = await run(circuitOfUnitary(u, n, 'valley'));
      const { report } = result;
      expect(report.verdict).toBe('narrowed');
      expect(report.after?.wires).toBe(width);
      const played = play(textOf(result), n);
      expect(played.wires).toBe(width);
      expect(distanceTo(u, played)).toBeLessThan(1e-20);
      expect(played.counts.get('cx')).toBe(entanglers);
      expect(report.check).toMatchObject({ proof: true, unfoldedWires: n });
      expect(report.reuse.length).toBe(n - width);
    });
  }

  test('the same seed gives the same text, another seed another', async () => {
    const circuit = circuitOfUnitary(plantedChain(4, 3, 3).u, 4, 'valley');
    const [first, again, other] = [
      await run(circuit),
      await run(circuit),
      await run(circuit, { seed: 2 }),
    ];
    expect(first.text).toBe(again.text);
    expect(first.text).not.toBe(other.text);
  });

  test('a chain written gate by gate narrows like its matrix', async () => {
    const { u } = plantedChain(3, 2, 4);
    const written = textOf(await run(circuitOfUnitary(u, 3, 'valley')));
    // the narrowed text without its reuse is a 3-wire circuit again: narrowing its own matrix must succeed
    expect(distanceTo(u, play(written, 3))).toBeLessThan(1e-20);
  });
});

describe('what cannot be narrowed', () => {
  test('a generic unitary: impossible, with a bound', async () => {
    const u = haarUnitary(16, random(1, 'generic'));
    const { report, text } = await run(circuitOfUnitary(u, 4, 'generic'));
    expect(report.verdict).toBe('impossible');
    expect(text).toBeNull();
    expect(report.reason).toMatch(/no equal circuit has fewer than 4 wires/);
    expect(report.bracket!.lower).toBeGreaterThan(0.01);
    expect(report.bracket!.reached).toBeGreaterThanOrEqual(report.bracket!.lower);
  });

  for (const n of [3, 4, 5]) {
    test(`the Fourier transform on ${n} wires as a block keeps all its wires`, async () => {
      const { report } = await run(fourier(n));
      expect(report.verdict).toBe('impossible');
      expect(report.reason).toContain(`fewer than ${n} wires`);
    });
  }

  test('fewer wires than a chain has: impossible, and how far the best attempt is', async () => {
    const { u } = plantedChain(4, 3, 11);
    const { report } = await run(circuitOfUnitary(u, 4, 'valley'), { wires: 2 });
    expect(report.verdict).toBe('impossible');
    expect(report.reason).toContain('fewer than 3 wires');
    expect(report.bracket!.lower).toBeGreaterThan(0);
  });
});

describe('within a tolerance', () => {
  const u = perturbed(plantedChain(4, 3, 1).u, 16, 1e-3, 3);
  const circuit = circuitOfUnitary(u, 4, 'noisy');

  test('above the bound: the nearest chain, and a bracket that is nearly closed', async () => {
    const result = await run(circuit, { tolerance: 1e-5 });
    const { report } = result;
    expect(report.verdict).toBe('narrowed');
    const distance = distanceTo(u, play(textOf(result), 4));
    expect(report.distance?.hilbertSchmidt).toBeCloseTo(distance, 12);
    expect(report.bracket!.lower).toBeLessThanOrEqual(distance);
    expect(report.bracket!.lower / distance).toBeGreaterThan(0.99);
  });

  test('below the bound: impossible', async () => {
    const { report } = await run(circuit, { tolerance: 1e-9 });
    expect(report.verdict).toBe('impossible');
    expect(report.bracket!.lower).toBeGreaterThan(1e-9);
  });
});

describe('measured outputs', () => {
  for (const n of [3, 4, 5]) {
    test(`the Fourier transform on ${n} wires, as a matrix: one wire with conditions`, async () => {
      const u = circuitUnitary(fourier(n));
      const result = await run(circuitOfUnitary(u, n, 'fourier'), { outputs: 'measured' });
      expect(result.report.after?.wires).toBe(1);
      expect(result.report.verdict).toBe('narrowed');
      expect(worstRowError(u, play(textOf(result), n))).toBeLessThan(1e-13);
    });

    test(`the same gate by gate: structure is enough (${n} wires)`, async () => {
      const { report, text } = await run(fourier(n), { outputs: 'measured' });
      expect(report.verdict).toBe('narrowed');
      expect(report.after?.wires).toBe(1);
      expect(text).toContain('h q[0]');
    });
  }
});

describe('programs', () => {
  test('parity of 22 stations: two wires, gates as they were written', async () => {
    const lines = ['OPENQASM 3;', 'include "stdgates.inc";', 'qubit[22] q;', 'bit[22] c;'];
    for (let k = 0; k < 21; k++) lines.push(`h q[${k}];`, `cx q[${k}], q[21];`, `h q[${k}];`);
    for (let k = 0; k < 22; k++) lines.push(`c[${k}] = measure q[${k}];`);
    const { circuit } = readCircuit(lines.join('\n'), 'parity.qasm');
    const { report } = await run(circuit);
    expect(report.after?.wires).toBe(2);
    expect(report.contract).toBe('program');
    expect(report.fits).toEqual([]);
  });
});

describe('stopping', () => {
  test('a job that is stopped at once still answers with an equal circuit', async () => {
    const { u } = plantedChain(3, 2, 5);
    const control = { ...freeRunning, stopped: () => true };
    const result = await run(circuitOfUnitary(u, 3, 'valley'), { control });
    expect(distanceTo(u, play(textOf(result), 3))).toBeLessThan(1e-10);
  });

  test('wrong options are the user’s mistake', async () => {
    await expect(run(fourier(2), { wires: 0 })).rejects.toThrow(/wires must be a whole number/);
    await expect(run(fourier(2), { tolerance: 2 })).rejects.toThrow(/tolerance must be in/);
  });
});
