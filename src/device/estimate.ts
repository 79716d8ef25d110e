/**
 * Estimates how likely a circuit runs on a device without an error.
 *
 * Method: the product of the process fidelities of its pieces. A gate of average infidelity e on k wires,
 * D = 2^k, has process fidelity 1 - e (D + 1)/D (Nielsen, Phys. Lett. A 303, 249 (2002)); waiting for time t has
 * (1 + e^{-t/T1} + 2 e^{-t/T2})/4 (the T1/T2 channel); readout and reset count 1 - error. For stochastic Pauli
 * errors the product is the probability that none occurs, so it bounds the success from below to first order.
 * Left out: crosstalk, leakage, coherent errors that add up, drift, and everything the device file does not
 * give, which is named in `missing`. The device maker's own calibration data and a run on the device decide.
 * Cost: linear in the number of operations.
 */
import type { Circuit } from '../circuit/circuit.ts';
import { type Device, linkBetween } from './device.ts';
import { isFrameChange, type Schedule, scheduleCircuit } from './schedule.ts';

export type Estimate = {
  /** Estimated probability of a run without an error. */
  success: number;
  /** The factors of `success`. */
  parts: { oneWireGates: number; entanglers: number; idle: number; readout: number; reset: number };
  durationNs: number;
  /** What the device file does not give, in words; each counts as perfect. */
  missing: string[];
};

/** The wires of the circuit on the wires of the device of the same number. */
export function identityPlacement(circuit: Circuit): number[] {
  return Array.from({ length: circuit.wires }, (_, wire) => wire);
}

/** Process fidelity of waiting t ns on a wire with the given times in us. */
export function idleFidelity(
  tNs: number,
  t1Us: number | undefined,
  t2Us: number | undefined,
): number {
  const tUs = tNs / 1000;
  const relax = t1Us === undefined ? 1 : Math.exp(-tUs / t1Us);
  const dephase = t2Us === undefined ? Math.sqrt(relax) : Math.exp(-tUs / t2Us);
  return (1 + relax + 2 * dephase) / 4;
}

export function estimateSuccess(
  circuit: Circuit,
  device: Device,
  placement: readonly number[] = identityPlacement(circuit),
  schedule: Schedule = scheduleCircuit(circuit, device, placement),
): Estimate {
  const missing = new Set(schedule.missing);
  const parts = { oneWireGates: 1, entanglers: 1, idle: 1, readout: 1, reset: 1 };
  const error = (value: number | undefined, name: string): number => {
    if (value === undefined) missing.add(name);
    return value ?? 0;
  };
  for (const operation of circuit.operations) {
    if (operation.kind === 'measure') {
      const place = device.wires[placement[operation.wire]!];
      parts.readout *= 1 - error(place?.readoutError, 'readout error');
    } else if (operation.kind === 'reset') {
      parts.reset *= 1 - error(device.resetError, 'reset error');
    } else if (operation.kind === 'gate' && !isFrameChange(operation)) {
      const places = operation.wires.map((wire) => placement[wire]!);
      if (places.length === 1) {
        const e = error(device.wires[places[0]!]?.gateError, 'one-wire gate error');
        parts.oneWireGates *= Math.max(0, 1 - 1.5 * e);
      } else if (places.length === 2) {
        const link = linkBetween(device, places[0]!, places[1]!);
        if (!link) missing.add(`a link between device wires ${places[0]} and ${places[1]}`);
        parts.entanglers *= Math.max(0, 1 - 1.25 * error(link?.error, 'entangler error'));
      } else {
        missing.add('gates on three wires or more');
      }
    }
  }
  for (const { wire, durationNs } of schedule.idles) {
    const place = device.wires[placement[wire]!];
    if (place?.t1Us === undefined) missing.add('T1');
    if (place?.t2Us === undefined) missing.add('T2');
    parts.idle *= idleFidelity(durationNs, place?.t1Us, place?.t2Us);
  }
  const { oneWireGates, entanglers, idle, readout, reset } = parts;
  return {
    success: oneWireGates * entanglers * idle * readout * reset,
    parts,
    durationNs: schedule.totalNs,
    missing: [...missing].sort(),
  };
}

export type BreakEven = {
  /** Which figure of the device is varied. */
  figure: 'reset duration' | 'measure duration' | 'reset error' | 'readout error';
  unit: 'ns' | 'probability';
  now: number;
  /** Below this value the narrower circuit succeeds more often; null when no value changes the verdict. */
  threshold: number | null;
};

/**
 * What would have to change for the other circuit to be the better one: for each figure, the value at which
 * both estimates are equal, all others as they are (bisection on the monotone difference, to 1e-6 relative).
 */
export function breakEven(
  before: { circuit: Circuit; placement?: readonly number[] },
  after: { circuit: Circuit; placement?: readonly number[] },
  device: Device,
): BreakEven[] {
  const gain = (changed: Device): number =>
    Math.log(estimateSuccess(after.circuit, changed, after.placement).success) -
    Math.log(estimateSuccess(before.circuit, changed, before.placement).success);
  const rows: { figure: BreakEven['figure']; top: number; now: number; set(x: number): Device }[] =
    [
      {
        figure: 'reset duration',
        top: 1e7,
        now: device.resetDurationNs ?? 0,
        set: (x) => ({ ...device, resetDurationNs: x }),
      },
      {
        figure: 'measure duration',
        top: 1e7,
        now: device.measureDurationNs ?? 0,
        set: (x) => ({ ...device, measureDurationNs: x }),
      },
      {
        figure: 'reset error',
        top: 0.5,
        now: device.resetError ?? 0,
        set: (x) => ({ ...device, resetError: x }),
      },
      {
        figure: 'readout error',
        top: 0.5,
        now: mean(device.wires.map(({ readoutError }) => readoutError ?? 0)),
        set: (x) => ({ ...device, wires: device.wires.map((w) => ({ ...w, readoutError: x })) }),
      },
    ];
  return rows.map(({ figure, top, now, set }) => ({
    figure,
    unit: figure.endsWith('duration') ? 'ns' : 'probability',
    now,
    threshold: crossing((x) => gain(set(x)), top),
  }));
}

function mean(values: readonly number[]): number {
  return values.length === 0 ? 0 : values.reduce((sum, x) => sum + x, 0) / values.length;
}

/** The x in [0, top] where f changes sign; null when it does not. */
function crossing(f: (x: number) => number, top: number): number | null {
  let [low, high] = [0, top];
  const [atLow, atHigh] = [f(low), f(high)];
  if (!(atLow > 0 !== atHigh > 0)) return null;
  for (let step = 0; step < 100 && high - low > 1e-6 * high; step++) {
    const middle = (low + high) / 2;
    if (f(middle) > 0 === atLow > 0) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}
