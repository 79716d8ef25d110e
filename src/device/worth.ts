/**
 * Says whether a narrower circuit is worth its depth on a device, and checks the estimate by simulation.
 *
 * Method: the success estimates of both circuits (`estimate.ts`) decide; the figures of the device at which the
 * verdict would turn are found by bisection (`breakEven`). `simulateNoisy` runs a circuit with the device's noise:
 * on its density matrix up to 8 wires (exact), by trajectories up to 16 (95 % intervals).
 * Everything here rests on a noise model: crosstalk, leakage, coherent errors and drift are left out, and the
 * device maker's calibration data decide.
 */
import type { Circuit } from '../circuit/circuit.ts';
import type { Control } from '../control.ts';
import { InputError } from '../input-error.ts';
import {
  bitDistribution,
  DENSITY_WIRES_MAX,
  type Distribution,
  totalVariation,
} from './density.ts';
import type { Device } from './device.ts';
import { type BreakEven, breakEven, type Estimate, estimateSuccess } from './estimate.ts';
import { type Interval, runTrajectories, TRAJECTORY_WIRES_MAX } from './trajectories.ts';

export type NoisyOptions = {
  placement?: readonly number[];
  /** Number of random histories; default 1000. */
  shots?: number;
  seed?: number;
  control?: Control;
};

export type NoisyRun = {
  method: 'density matrix' | 'trajectories';
  /** Histories run; the share without any error is what the success estimate predicts. */
  shots: number;
  clean: Interval;
  /** Distribution of the bits: exact, or the shares seen. */
  distribution: Distribution;
  /** 1 - total variation distance from the noiseless bits; null where the exact distribution is out of reach. */
  agreement: number | null;
};

/** Runs a circuit with the noise of a device; all wires start in |0>. */
export async function simulateNoisy(
  circuit: Circuit,
  device: Device,
  { placement, shots = 1000, seed = 1, control }: NoisyOptions = {},
): Promise<NoisyRun> {
  if (circuit.wires > TRAJECTORY_WIRES_MAX) {
    throw new InputError({
      code: 'too-large',
      message: `noisy simulation of ${circuit.wires} wires: ${TRAJECTORY_WIRES_MAX} wires is the limit here`,
    });
  }
  const options = {
    shots,
    seed,
    ...(placement ? { placement } : {}),
    ...(control ? { control } : {}),
  };
  const histories = await runTrajectories(circuit, device, options);
  const { clean, counts } = histories;
  const exact =
    circuit.wires <= DENSITY_WIRES_MAX ? exactly(circuit, device, placement) : undefined;
  if (exact) return { method: 'density matrix', shots: histories.shots, clean, ...exact };
  const distribution: Distribution = new Map();
  for (const [key, count] of counts) distribution.set(key, count / Math.max(1, histories.shots));
  return {
    method: 'trajectories',
    shots: histories.shots,
    clean,
    distribution,
    agreement: null,
  };
}

/** The exact distribution, unless it needs too many branches. */
function exactly(
  circuit: Circuit,
  device: Device,
  placement: readonly number[] | undefined,
): { distribution: Distribution; agreement: number } | undefined {
  try {
    const distribution = bitDistribution(circuit, device, placement);
    return {
      distribution,
      agreement: 1 - totalVariation(distribution, bitDistribution(circuit)),
    };
  } catch (error) {
    // too many branches: the trajectories answer alone
    if (error instanceof InputError && error.code === 'too-large') return undefined;
    throw error;
  }
}

export type Placed = { circuit: Circuit; placement?: readonly number[] };

export type Worth = {
  before: Estimate;
  after: Estimate;
  /** True when the narrower circuit is estimated to succeed more often. */
  isWorth: boolean;
  breakEven: BreakEven[];
  /** The verdict, what would turn it, and what is left out, in plain sentences. */
  sentences: string[];
};

/** Compares the original and the narrower circuit on a device. */
export function weighNarrowing(before: Placed, after: Placed, device: Device): Worth {
  const one = estimateSuccess(before.circuit, device, before.placement);
  const two = estimateSuccess(after.circuit, device, after.placement);
  const isWorth = two.success > one.success;
  const rows = breakEven(before, after, device);
  const verdict = `narrowing is estimated to ${isWorth ? 'raise' : 'lower'} the success on ${device.name} from ${percent(one.success)} to ${percent(two.success)}`;
  const sentences = [
    verdict,
    ...rows.map((row) => turningPoint(row, isWorth)).filter((s) => s !== ''),
  ];
  const missing = [...new Set([...one.missing, ...two.missing])].sort();
  if (missing.length > 0) {
    sentences.push(
      `the device file does not give, and the estimate takes as perfect: ${missing.join(', ')}`,
    );
  }
  sentences.push(
    'this is an estimate from a noise model without crosstalk, leakage, coherent errors and drift; the calibration data of the device maker decide',
  );
  return { before: one, after: two, isWorth, breakEven: rows, sentences };
}

function percent(probability: number): string {
  return `${(100 * probability).toPrecision(3)} %`;
}

/** `it would pay with a reset duration below 120 ns (now 300 ns)`. */
function turningPoint({ figure, unit, now, threshold }: BreakEven, isWorth: boolean): string {
  if (threshold === null) return '';
  const show = (x: number): string =>
    unit === 'ns' ? `${Number(x.toPrecision(3))} ns` : `${Number(x.toPrecision(3))}`;
  const side = now > threshold === isWorth ? 'above' : 'below';
  return isWorth
    ? `it stays worth it with a ${figure} ${side} ${show(threshold)} (now ${show(now)})`
    : `it would pay with a ${figure} ${now > threshold ? 'below' : 'above'} ${show(threshold)} (now ${show(now)})`;
}
