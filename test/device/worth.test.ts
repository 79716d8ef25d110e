import { describe, expect, test } from 'vitest';
import { type Circuit, emptyCircuit, gate, type Operation } from '../../src/circuit/circuit.ts';
import type { Device } from '../../src/device/device.ts';
import { simulateNoisy, weighNarrowing } from '../../src/device/worth.ts';
import { InputError } from '../../src/input-error.ts';

const measure = (wire: number, bit: number): Operation => ({ kind: 'measure', wire, bit });
const reset = (wire: number): Operation => ({ kind: 'reset', wire });

/** A parity check of n stations on one shared wire: n + 1 wires, or 2 with a station's wire used again. */
function parity(n: number, isNarrow: boolean): Circuit {
  const operations: Operation[] = [];
  const target = isNarrow ? 1 : n;
  for (let k = 0; k < n; k++) {
    const wire = isNarrow ? 0 : k;
    if (isNarrow && k > 0) operations.push(reset(wire));
    operations.push(
      gate('h', [wire]),
      gate('cx', [wire, target]),
      gate('h', [wire]),
      measure(wire, k),
    );
  }
  return { ...emptyCircuit(target + 1, n), operations };
}

const star = (wires: number, resetDurationNs: number, resetError = 2e-3): Device => ({
  name: 'star',
  wires: Array.from({ length: wires }, () => ({
    t1Us: 60,
    t2Us: 40,
    readoutError: 0.01,
    gateError: 3e-4,
    gateDurationNs: 30,
  })),
  links: Array.from({ length: wires }, (_, a) =>
    Array.from({ length: a }, (_, b) => ({
      between: [a, b] as const,
      error: 5e-3,
      durationNs: 200,
    })),
  ).flat(),
  measureDurationNs: 500,
  resetDurationNs,
  resetError,
});

describe('weighNarrowing', () => {
  const before = { circuit: parity(4, false) };
  const after = { circuit: parity(4, true) };

  test('the verdict turns exactly at the break-even figures', () => {
    for (const duration of [0, 300, 3000]) {
      const worth = weighNarrowing(before, after, star(5, duration));
      expect(worth.isWorth).toBe(worth.after.success > worth.before.success);
      expect(worth.sentences[0]).toContain(
        worth.isWorth ? 'to raise the success' : 'to lower the success',
      );
      const row = worth.breakEven.find(({ figure }) => figure === 'reset error');
      if (row?.threshold) {
        const at = (error: number): boolean =>
          weighNarrowing(before, after, star(5, duration, error)).isWorth;
        expect(at(row.threshold * 0.99)).not.toBe(at(row.threshold * 1.01));
      }
    }
  });

  test('says what would have to change, and what is left out', () => {
    const bare: Device = { ...star(5, 2000), measureDurationNs: 400 };
    const { sentences } = weighNarrowing(before, after, {
      ...bare,
      wires: bare.wires.map(({ t2Us, ...w }) => w),
    });
    expect(sentences.some((s) => s.includes('takes as perfect: T2'))).toBe(true);
    expect(sentences[sentences.length - 1]).toContain(
      'calibration data of the device maker decide',
    );
  });
});

describe('simulateNoisy', () => {
  test('a perfect device agrees with the noiseless bits', async () => {
    const perfect: Device = { name: 'perfect', wires: [], links: [] };
    const run = await simulateNoisy(parity(3, true), perfect, { shots: 20 });
    expect(run.agreement).toBeCloseTo(1, 12);
    expect(run.clean.value).toBe(1);
    expect([...run.distribution.values()].reduce((a, b) => a + b, 0)).toBeCloseTo(1, 12);
  });

  test('the estimate lies in the interval of the simulated share without errors, before and after', async () => {
    const device = star(5, 300);
    const worth = weighNarrowing(
      { circuit: parity(4, false) },
      { circuit: parity(4, true) },
      device,
    );
    for (const [circuit, { success }] of [
      [parity(4, false), worth.before],
      [parity(4, true), worth.after],
    ] as const) {
      const { clean, agreement, method } = await simulateNoisy(circuit, device, {
        shots: 3000,
        seed: 3,
      });
      expect(method).toBe('density matrix');
      // the estimate counts process fidelities, which are within first order of the share without errors
      expect(success).toBeGreaterThan(clean.low - 0.02);
      expect(success).toBeLessThan(clean.high + 0.02);
      // errors that do not matter for the bits make the agreement higher than the share without errors
      expect(agreement).toBeGreaterThan(clean.low);
    }
  });

  test('beyond the density matrix: trajectories, the same for the same seed; beyond them a message', async () => {
    const wide: Circuit = { ...emptyCircuit(10, 1), operations: [gate('h', [9]), measure(9, 0)] };
    const device = star(10, 300);
    const run = await simulateNoisy(wide, device, { shots: 40 });
    expect(run).toMatchObject({ method: 'trajectories', agreement: null, shots: 40 });
    expect(await simulateNoisy(wide, device, { shots: 40 })).toEqual(run);
    await expect(simulateNoisy(emptyCircuit(17), device)).rejects.toThrow(InputError);
  });

  test('many branches on many wires are refused before memory runs out, and trajectories answer', async () => {
    const operations: Operation[] = [];
    for (let k = 0; k < 12; k++) operations.push(gate('h', [0]), measure(0, k), reset(0));
    const { method } = await simulateNoisy({ ...emptyCircuit(8, 12), operations }, star(8, 300), {
      shots: 5,
    });
    expect(method).toBe('trajectories');
  }, 60_000);
});
