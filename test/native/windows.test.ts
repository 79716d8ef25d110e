import { describe, expect, test } from 'vitest';
import {
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
} from '../../src/circuit/circuit.ts';
import { circuitUnitary, gateMatrix } from '../../src/circuit/unitary.ts';
import { type Control, freeRunning } from '../../src/control.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';
import { shannonGates } from '../../src/native/shannon.ts';
import { entanglerUse } from '../../src/native/two-wire.ts';
import { dimensionBound } from '../../src/native/wanted.ts';
import { cutWindows, inEntanglers, refitWindows } from '../../src/native/windows.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import type { Pair } from '../../src/reshape/placement-beam.ts';

const unitaryOf = (operations: readonly Operation[], wires: number): Float64Array =>
  circuitUnitary({ ...emptyCircuit(wires), operations });
const cxOf = (operations: readonly GateOperation[]): number =>
  operations.filter(({ wires }) => wires.length === 2).length;
const use = entanglerUse({ name: 'cx' });

function settings(wires: number, control: Control = freeRunning) {
  const links: Pair[] = [];
  for (let a = 0; a < wires; a++) for (let b = a + 1; b < wires; b++) links.push([a, b]);
  const enoughFor = (k: number): number => (k === 2 ? 3 : dimensionBound(k, 2 ** k, 4));
  const runJobs = inProcess(jobTable);
  return { use, links, enoughFor, seed: 1, optimiser: 'lm' as const, runJobs, control };
}

describe('cutting', () => {
  test('windows put back give the same unitary, whatever the wires', () => {
    const draw = random(1, 'cut');
    for (let round = 0; round < 10; round++) {
      const operations = Array.from({ length: 40 }, () => {
        const a = Math.floor(5 * draw());
        const b = (a + 1 + Math.floor(4 * draw())) % 5;
        return draw() < 0.5 ? gate('ry', [a], draw()) : gate('cx', [a, b]);
      });
      const wanted = unitaryOf(operations, 5);
      for (const size of [2, 3, 4]) {
        for (const only of [null, [0, 1, 2, 3].slice(0, size), [4, 2, 0, 1].slice(0, size)]) {
          const items = cutWindows(operations, size, only);
          const made = items.flatMap(({ operation, window }) =>
            window ? window.members : operation ? [operation] : [],
          );
          expect(made).toHaveLength(operations.length);
          expect(hilbertSchmidtDistance(wanted, unitaryOf(made, 5)).distance).toBeLessThan(1e-26);
          for (const { window } of items) {
            const inside = new Set(window?.members.flatMap(({ wires }) => wires));
            expect(inside.size).toBeLessThanOrEqual(size);
          }
        }
      }
    }
  });
});

describe('fitting anew', () => {
  test('a decomposition on 4 wires gets shorter and stays the same', async () => {
    const u = haarUnitary(16, random(4, 'windows'));
    const operations = inEntanglers(shannonGates(u, 4), use, gateMatrix)!;
    const refitted = await refitWindows(operations, 4, settings(4));
    // four blocks on three wires at 14 instead of 20, less what the diagonals save: 4 * 14 + 23
    expect(cxOf(refitted.operations)).toBeLessThanOrEqual(83);
    expect(refitted.isStopped).toBe(false);
    expect(hilbertSchmidtDistance(u, unitaryOf(refitted.operations, 4)).distance).toBeLessThan(
      1e-20,
    );
  });

  test('gates that undo each other vanish', async () => {
    const half = [gate('cx', [0, 1]), gate('ry', [1], 0.3), gate('cx', [1, 2]), gate('cx', [0, 2])];
    const back = half
      .slice()
      .reverse()
      .map((o) => (o.name === 'ry' ? gate('ry', [1], -0.3) : o));
    const refitted = await refitWindows([...half, ...back], 4, settings(4));
    expect(cxOf(refitted.operations)).toBe(0);
  });

  test('a stop keeps what is there', async () => {
    const u = haarUnitary(16, random(4, 'windows'));
    const operations = inEntanglers(shannonGates(u, 4), use, gateMatrix)!;
    const refitted = await refitWindows(operations, 4, settings(4, { ...freeRunning, stopped: () => true })); // biome-ignore format: one call
    expect(refitted).toEqual({ operations, improved: 0, isStopped: true });
  });
});
