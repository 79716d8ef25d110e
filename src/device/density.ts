/**
 * Runs a circuit with the noise of a device on its density matrix and gives the exact distribution of its bits.
 *
 * Shape: the density matrix of n wires is kept as a vector on 2n wires (row index on wires 0..n-1, column index
 * on n..2n-1), so that gates and channels are matrices on few wires. A measured wire whose outcome is needed
 * later (it is reset, used again, or its bit is read by a condition) splits the run into branches; other
 * measurements wait until the end and are read off the diagonal.
 * Convention: all wires start in |0>. Noise: after each gate a depolarising channel of the gate's error, the
 * T1/T2 channel during waits, a wrong bit with the readout error, a reset that leaves |1> with the reset error.
 * Frame changes are free. Gates on three wires or more carry no noise of their own.
 * Cost: 4^n per gate and branch. Fails: InputError `too-large` above 8 wires, 4096 branches or 128 MiB of branches.
 */
import { bitsRead, type Circuit, evaluateBits, operationWires } from '../circuit/circuit.ts';
import { applyMatrixInto, gateMatrix } from '../circuit/unitary.ts';
import { InputError } from '../input-error.ts';
import { type Device, linkBetween } from './device.ts';
import { depolarising, depolarisingProbability, idleKraus, superoperator } from './noise.ts';
import { isFrameChange, scheduleCircuit } from './schedule.ts';

export const DENSITY_WIRES_MAX = 8;
export const BRANCHES_MAX = 4096;
/** Memory for all branches together. */
const BRANCH_BYTES_MAX = 2 ** 27;

type Branch = { bits: Map<number, boolean>; rho: Float64Array };

/** Probability of every recorded bit string; key: one character per bit, bit 0 first. */
export type Distribution = Map<string, number>;

/** The exact noisy distribution of the circuit's bits; without a device, the ideal one. */
export function bitDistribution(
  circuit: Circuit,
  device?: Device,
  placement: readonly number[] = Array.from({ length: circuit.wires }, (_, k) => k),
): Distribution {
  const n = circuit.wires;
  if (n > DENSITY_WIRES_MAX) {
    throw new InputError({
      code: 'too-large',
      message: `a density matrix of ${n} wires needs 4^${n} x 16 bytes; ${DENSITY_WIRES_MAX} wires is the limit here`,
    });
  }
  const run = new DensityRun(circuit, device, placement);
  circuit.operations.forEach((_, k) => {
    run.step(k);
  });
  return run.distribution();
}

/** One run through a circuit: the branches, and what is measured at the end. Owns its density matrices. */
class DensityRun {
  private branches: Branch[];
  /** Wires whose measurement waits until the end, with the bit each goes to. */
  private readonly last = new Map<number, number>();
  private readonly waits: Map<number, { wire: number; durationNs: number }[]> = new Map();
  private readonly finalMeasurements: ReadonlySet<number>;

  private readonly circuit: Circuit;
  private readonly device: Device | undefined;
  private readonly placement: readonly number[];

  constructor(circuit: Circuit, device: Device | undefined, placement: readonly number[]) {
    this.circuit = circuit;
    this.device = device;
    this.placement = placement;
    const rho = new Float64Array(2 * 4 ** circuit.wires);
    rho[0] = 1;
    this.branches = [{ bits: new Map(), rho }];
    this.finalMeasurements = finalMeasurements(circuit);
    if (device) {
      for (const idle of scheduleCircuit(circuit, device, placement).idles) {
        const list = this.waits.get(idle.beforeOperation) ?? [];
        this.waits.set(idle.beforeOperation, [...list, idle]);
      }
    }
  }

  step(k: number): void {
    const operation = this.circuit.operations[k]!;
    for (const { wire, durationNs } of this.waits.get(k) ?? []) this.wait(wire, durationNs);
    if (operation.kind === 'barrier') return;
    if (operation.kind === 'measure' && this.finalMeasurements.has(k)) {
      this.last.set(operation.wire, operation.bit);
      return;
    }
    const { condition } = operation;
    const before = this.branches;
    this.branches = [];
    for (const branch of before) {
      const isOn = !condition || evaluateBits(condition, (bit) => branch.bits.get(bit) ?? false);
      if (!isOn) this.branches.push(branch);
      else if (operation.kind === 'gate') {
        this.apply(branch.rho, k);
        this.branches.push(branch);
      } else if (operation.kind === 'measure') this.measure(branch, operation.wire, operation.bit);
      else if (operation.kind === 'reset') {
        this.reset(branch.rho, operation.wire);
        this.branches.push(branch);
      } else {
        const value = evaluateBits(operation.value, (bit) => branch.bits.get(bit) ?? false);
        this.branches.push({ ...branch, bits: new Map(branch.bits).set(operation.bit, value) });
      }
    }
    if (operation.kind !== 'gate') this.merge();
    const bytes = 16 * 4 ** this.circuit.wires;
    const most = Math.min(BRANCHES_MAX, Math.floor(BRANCH_BYTES_MAX / bytes));
    if (this.branches.length > most) {
      throw new InputError({
        code: 'too-large',
        message: `the noisy simulation needs more than ${most} branches of measured bits; that is the limit for ${this.circuit.wires} wires`,
      });
    }
  }

  private channel(rho: Float64Array, matrix: Float64Array, wires: readonly number[]): void {
    const n = this.circuit.wires;
    applyMatrixInto(rho, matrix, [...wires, ...wires.map((w) => n + w)], 2 * n, 1);
  }

  private wait(wire: number, durationNs: number): void {
    const { t1Us, t2Us } = this.device?.wires[this.placement[wire]!] ?? {};
    const matrix = superoperator(idleKraus(durationNs, t1Us, t2Us), 1);
    for (const { rho } of this.branches) this.channel(rho, matrix, [wire]);
  }

  private apply(rho: Float64Array, k: number): void {
    const operation = this.circuit.operations[k]!;
    if (operation.kind !== 'gate') return;
    const n = this.circuit.wires;
    const u = gateMatrix(operation);
    const conjugate = u.slice();
    for (let i = u.length / 2; i < u.length; i++) conjugate[i] = -u[i]!;
    applyMatrixInto(rho, u, operation.wires, 2 * n, 1);
    applyMatrixInto(rho, conjugate, operation.wires.map((w) => n + w), 2 * n, 1); // biome-ignore format: twin of the line above
    if (!this.device || isFrameChange(operation) || operation.wires.length > 2) return;
    const places = operation.wires.map((wire) => this.placement[wire]!);
    const error =
      places.length === 1
        ? this.device.wires[places[0]!]?.gateError
        : linkBetween(this.device, places[0]!, places[1]!)?.error;
    if (!error) return;
    const p = depolarisingProbability(error, places.length);
    this.channel(rho, depolarising(p, places.length), operation.wires);
  }

  private measure(branch: Branch, wire: number, bit: number): void {
    const wrong = this.device?.wires[this.placement[wire]!]?.readoutError ?? 0;
    for (const outcome of [0, 1]) {
      const rho = branch.rho.slice();
      const projector = new Float64Array(8);
      projector[outcome * 3] = 1;
      const n = this.circuit.wires;
      applyMatrixInto(rho, projector, [wire], 2 * n, 1);
      applyMatrixInto(rho, projector, [n + wire], 2 * n, 1);
      for (const isWrong of [false, true]) {
        const weight = isWrong ? wrong : 1 - wrong;
        if (weight === 0) continue;
        const bits = new Map(branch.bits);
        if (bit >= 0) bits.set(bit, (outcome === 1) !== isWrong);
        this.branches.push({ bits, rho: rho.map((x) => weight * x) });
      }
    }
  }

  private reset(rho: Float64Array, wire: number): void {
    const e = this.device?.resetError ?? 0;
    // rho -> (|0><0| (1 - e) + |1><1| e) Tr_wire rho
    const matrix = new Float64Array(32);
    matrix[0] = matrix[3] = 1 - e;
    matrix[12] = matrix[15] = e;
    this.channel(rho, matrix, [wire]);
  }

  /** Adds up branches that recorded the same bits. */
  private merge(): void {
    const found = new Map<string, Branch>();
    for (const branch of this.branches) {
      const key = this.keyOf(branch.bits);
      const twin = found.get(key);
      if (twin) for (let i = 0; i < twin.rho.length; i++) twin.rho[i]! += branch.rho[i]!;
      else found.set(key, branch);
    }
    this.branches = [...found.values()];
  }

  private keyOf(bits: ReadonlyMap<number, boolean>): string {
    let key = '';
    for (let bit = 0; bit < this.circuit.bits; bit++) key += bits.get(bit) ? '1' : '0';
    return key;
  }

  distribution(): Distribution {
    const n = this.circuit.wires;
    const d = 2 ** n;
    const out: Distribution = new Map();
    const measured = [...this.last].filter(([, bit]) => bit >= 0);
    for (const { bits, rho } of this.branches) {
      for (let basis = 0; basis < d; basis++) {
        const weight = rho[basis * d + basis]!;
        if (weight <= 0) continue;
        let outcomes: [Map<number, boolean>, number][] = [[new Map(bits), weight]];
        for (const [wire, bit] of measured) {
          const value = ((basis >> (n - 1 - wire)) & 1) === 1;
          const wrong = this.device?.wires[this.placement[wire]!]?.readoutError ?? 0;
          outcomes = outcomes.flatMap(([known, w]) =>
            [
              [new Map(known).set(bit, value), w * (1 - wrong)] as [Map<number, boolean>, number],
              [new Map(known).set(bit, !value), w * wrong] as [Map<number, boolean>, number],
            ].filter(([, weightHere]) => weightHere > 0),
          );
        }
        for (const [known, w] of outcomes) {
          const key = this.keyOf(known);
          out.set(key, (out.get(key) ?? 0) + w);
        }
      }
    }
    return new Map([...out].sort(([a], [b]) => (a < b ? -1 : a > b ? 1 : 0)));
  }
}

/** Measurements that nothing comes after: their wire is not used again and their bit is not read or rewritten. */
function finalMeasurements({ operations, wires, bits }: Circuit): Set<number> {
  const found = new Set<number>();
  const wireUsed = new Uint8Array(wires);
  const bitUsed = new Uint8Array(bits);
  for (let k = operations.length - 1; k >= 0; k--) {
    const operation = operations[k]!;
    if (operation.kind === 'measure' && !operation.condition) {
      const isLast = !wireUsed[operation.wire] && (operation.bit < 0 || !bitUsed[operation.bit]);
      if (isLast) found.add(k);
    }
    for (const bit of bitsRead(operation)) bitUsed[bit] = 1;
    if (operation.kind === 'measure' || operation.kind === 'assign') {
      if (operation.bit >= 0) bitUsed[operation.bit] = 1;
    }
    if (operation.kind !== 'barrier')
      for (const wire of operationWires(operation)) wireUsed[wire] = 1;
  }
  return found;
}

/** Half the sum of absolute differences of two distributions: the most an observer can tell them apart by. */
export function totalVariation(a: Distribution, b: Distribution): number {
  const keys = new Set([...a.keys(), ...b.keys()]);
  let sum = 0;
  for (const key of keys) sum += Math.abs((a.get(key) ?? 0) - (b.get(key) ?? 0));
  return sum / 2;
}
