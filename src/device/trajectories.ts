/**
 * Runs a circuit with the noise of a device many times on a state vector, one random history each.
 *
 * Method: quantum trajectories (Dalibard, Castin, Molmer, PRL 68, 580 (1992)): a Kraus operator is drawn with
 * its probability in the present state and applied; depolarising draws one of the 4^k Paulis. The mean over
 * histories is the density matrix of `density.ts`, same noise and conventions.
 * Intervals: Wilson's score interval at 95 % (E. B. Wilson, J. Am. Stat. Assoc. 22, 209 (1927)).
 * Cost: 2^n per gate and history. The same seed gives the same histories.
 * Fails: InputError `too-large` above 16 wires.
 */
import { type Circuit, evaluateBits, type Operation } from '../circuit/circuit.ts';
import { PAULI } from '../circuit/gates.ts';
import { applyGateInto, applyMatrixInto } from '../circuit/unitary.ts';
import { type Control, freeRunning } from '../control.ts';
import { InputError } from '../input-error.ts';
import { type Random, random } from '../numeric/random.ts';
import { type Device, linkBetween } from './device.ts';
import { depolarisingProbability, idleKraus } from './noise.ts';
import { type Idle, isFrameChange, scheduleCircuit } from './schedule.ts';

export const TRAJECTORY_WIRES_MAX = 16;

export type Interval = { value: number; low: number; high: number };

export type TrajectoryResult = {
  shots: number;
  /** Share of histories in which no error happened at all, with its 95 % interval. */
  clean: Interval;
  /** How often each bit string was recorded; bit 0 first. */
  counts: Map<string, number>;
};

/** 95 % score interval for `hits` of `shots`. */
export function wilsonInterval(hits: number, shots: number): Interval {
  if (shots === 0) return { value: Number.NaN, low: 0, high: 1 };
  const z = 1.959963984540054;
  const value = hits / shots;
  const centre = (value + (z * z) / (2 * shots)) / (1 + (z * z) / shots);
  const spread = Math.sqrt((value * (1 - value)) / shots + (z * z) / (4 * shots * shots));
  const half = (z * spread) / (1 + (z * z) / shots);
  return { value, low: Math.max(0, centre - half), high: Math.min(1, centre + half) };
}

export type TrajectoryOptions = {
  shots: number;
  seed: number;
  placement?: readonly number[];
  control?: Control;
};

export async function runTrajectories(
  circuit: Circuit,
  device: Device,
  { shots, seed, placement, control = freeRunning }: TrajectoryOptions,
): Promise<TrajectoryResult> {
  if (circuit.wires > TRAJECTORY_WIRES_MAX) {
    throw new InputError({
      code: 'too-large',
      message: `trajectories of ${circuit.wires} wires are beyond the limit here, ${TRAJECTORY_WIRES_MAX} wires`,
    });
  }
  const places = placement ?? Array.from({ length: circuit.wires }, (_, k) => k);
  const waits = new Map<number, Idle[]>();
  for (const idle of scheduleCircuit(circuit, device, places).idles) {
    waits.set(idle.beforeOperation, [...(waits.get(idle.beforeOperation) ?? []), idle]);
  }
  const counts = new Map<string, number>();
  let clean = 0;
  let done = 0;
  for (; done < shots && !control.stopped(); done++) {
    const history = new History(circuit, device, places, random(seed, 'trajectory', done));
    circuit.operations.forEach((operation, k) => {
      for (const { wire, durationNs } of waits.get(k) ?? []) history.wait(wire, durationNs);
      history.step(operation);
    });
    if (history.isClean) clean++;
    const key = history.bits.map(Number).join('');
    counts.set(key, (counts.get(key) ?? 0) + 1);
    if (done % 16 === 15) {
      control.report({ stage: 'noisy simulation', done: done / shots });
      await control.pause();
    }
  }
  const ordered = new Map([...counts].sort(([a], [b]) => (a < b ? -1 : 1)));
  return { shots: done, clean: wilsonInterval(clean, done), counts: ordered };
}

const PAULIS = [PAULI.I, PAULI.X, PAULI.Y, PAULI.Z];

/** One random history; owns its state vector. */
class History {
  readonly bits: boolean[];
  isClean = true;
  private readonly state: Float64Array;
  private readonly circuit: Circuit;
  private readonly device: Device;
  private readonly places: readonly number[];
  private readonly draw: Random;

  constructor(circuit: Circuit, device: Device, places: readonly number[], draw: Random) {
    this.circuit = circuit;
    this.device = device;
    this.places = places;
    this.draw = draw;
    this.bits = new Array<boolean>(circuit.bits).fill(false);
    this.state = new Float64Array(2 * 2 ** circuit.wires);
    this.state[0] = 1;
  }

  step(operation: Operation): void {
    const { condition } = operation;
    if (condition && !evaluateBits(condition, (bit) => this.bits[bit]!)) return;
    switch (operation.kind) {
      case 'barrier':
        return;
      case 'assign':
        this.bits[operation.bit] = evaluateBits(operation.value, (bit) => this.bits[bit]!);
        return;
      case 'measure': {
        const outcome = this.collapse(operation.wire);
        const isWrong = this.happens(this.placeOf(operation.wire)?.readoutError);
        if (operation.bit >= 0) this.bits[operation.bit] = outcome !== isWrong;
        return;
      }
      case 'reset': {
        const outcome = this.collapse(operation.wire);
        const isWrong = this.happens(this.device.resetError);
        if (outcome !== isWrong) this.apply(PAULI.X, [operation.wire]);
        return;
      }
      case 'gate': {
        applyGateInto(this.state, operation, this.circuit.wires, 1);
        if (isFrameChange(operation) || operation.wires.length > 2) return;
        const places = operation.wires.map((wire) => this.places[wire]!);
        const error =
          places.length === 1
            ? this.device.wires[places[0]!]?.gateError
            : linkBetween(this.device, places[0]!, places[1]!)?.error;
        if (error) this.depolarise(operation.wires, error);
        return;
      }
    }
  }

  private placeOf(wire: number): Device['wires'][number] | undefined {
    return this.device.wires[this.places[wire]!];
  }

  private happens(probability: number | undefined): boolean {
    const happened = probability !== undefined && this.draw() < probability;
    if (happened) this.isClean = false;
    return happened;
  }

  private apply(matrix: Float64Array, wires: readonly number[]): void {
    applyMatrixInto(this.state, matrix, wires, this.circuit.wires, 1);
  }

  private depolarise(wires: readonly number[], error: number): void {
    if (this.draw() >= depolarisingProbability(error, wires.length)) return;
    for (const wire of wires) {
      const pauli = Math.min(3, Math.floor(4 * this.draw()));
      if (pauli > 0) {
        this.isClean = false;
        this.apply(PAULIS[pauli]!, [wire]);
      }
    }
  }

  wait(wire: number, durationNs: number): void {
    const { t1Us, t2Us } = this.placeOf(wire) ?? {};
    const kraus = idleKraus(durationNs, t1Us, t2Us);
    const [p0, p1] = this.populations(wire);
    // every operator here is diagonal or lowers |1>, so populations decide its probability
    let rest = this.draw() * (p0 + p1);
    for (const [index, a] of kraus.entries()) {
      const weight = p0 * (a[0]! ** 2 + a[2]! ** 2) + p1 * (a[1]! ** 2 + a[3]! ** 2);
      rest -= weight;
      if (rest > 0 && index < kraus.length - 1) continue;
      if (index > 0) this.isClean = false;
      const scale = 1 / Math.sqrt(weight);
      this.apply(
        a.map((x) => scale * x),
        [wire],
      );
      return;
    }
  }

  private populations(wire: number): [number, number] {
    const n = this.circuit.wires;
    const d = 2 ** n;
    const stride = 2 ** (n - 1 - wire);
    const sums: [number, number] = [0, 0];
    for (let i = 0; i < d; i++) {
      sums[i & stride ? 1 : 0] += this.state[i]! ** 2 + this.state[d + i]! ** 2;
    }
    return sums;
  }

  private collapse(wire: number): boolean {
    const [p0, p1] = this.populations(wire);
    const outcome = this.draw() * (p0 + p1) >= p0;
    const scale = 1 / Math.sqrt(outcome ? p1 : p0);
    const projector = new Float64Array(8);
    projector[outcome ? 3 : 0] = scale;
    this.apply(projector, [wire]);
    return outcome;
  }
}
