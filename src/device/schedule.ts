/**
 * Puts times to a circuit: when each operation starts and how long each wire waits.
 *
 * Units: nanoseconds. An operation starts when its wires and the bits it reads are free (as soon as possible);
 * then every operation before a wire's first entangler or measurement is moved as late as it can be, because
 * a wire that waits in |0> loses nothing. One-wire diagonal rotations (`rz`, `p`, `z`, `s`, `t` and their kin)
 * are taken as changes of frame and cost no time and no error, as is common practice on superconducting and
 * trapped-ion devices (no source).
 * A duration that the device does not give counts as zero and is named in `missing`.
 */
import {
  bitsRead,
  bitWritten,
  type Circuit,
  type Operation,
  operationWires,
} from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';
import { type Device, linkBetween } from './device.ts';

export type Idle = { wire: number; beforeOperation: number; durationNs: number };

export type Schedule = {
  startNs: Float64Array;
  durationNs: Float64Array;
  /** Waits of a wire that carries a qubit, in order of the operation that ends them. */
  idles: Idle[];
  totalNs: number;
  missing: Set<string>;
};

/** True for gates that a device does by changing the frame of the wire: free of time and error. */
export function isFrameChange(operation: Operation): boolean {
  if (operation.kind !== 'gate' || operation.wires.length !== 1 || operation.condition)
    return false;
  return operation.name === 'id' || (gateTable.get(operation.name)?.diagonal ?? false);
}

/** The time one operation takes, ns; `placement[w]` is the device's wire under wire w. */
export function durationOf(
  operation: Operation,
  device: Device,
  placement: readonly number[],
  missing: Set<string>,
): number {
  const known = (value: number | undefined, name: string): number => {
    if (value === undefined) missing.add(name);
    return value ?? 0;
  };
  switch (operation.kind) {
    case 'barrier':
    case 'assign':
      return 0;
    case 'measure':
      return known(device.measureDurationNs, 'measure duration');
    case 'reset':
      return known(device.resetDurationNs, 'reset duration');
    case 'gate': {
      if (isFrameChange(operation)) return 0;
      const places = operation.wires.map((wire) => placement[wire]!);
      if (places.length === 1) {
        return known(device.wires[places[0]!]?.gateDurationNs, 'one-wire gate duration');
      }
      const link = linkBetween(device, places[0]!, places[1]!);
      return known(link?.durationNs, 'entangler duration');
    }
  }
}

export function scheduleCircuit(
  circuit: Circuit,
  device: Device,
  placement: readonly number[],
): Schedule {
  const { operations, wires, bits } = circuit;
  const missing = new Set<string>();
  const durationNs = Float64Array.from(operations, (operation) =>
    durationOf(operation, device, placement, missing),
  );
  const startNs = new Float64Array(operations.length);
  const free = new Float64Array(wires + bits);
  operations.forEach((operation, k) => {
    const slots = slotsOf(operation, wires);
    const start = Math.max(0, ...slots.map((slot) => free[slot]!));
    startNs[k] = start;
    for (const slot of slots) free[slot] = start + durationNs[k]!;
  });
  const totalNs = Math.max(0, ...free);
  delayBeginnings(circuit, startNs, durationNs, totalNs);
  return { startNs, durationNs, idles: idlesOf(circuit, startNs, durationNs), totalNs, missing };
}

function slotsOf(operation: Operation, wires: number): number[] {
  const slots = [...operationWires(operation), ...bitsRead(operation).map((bit) => wires + bit)];
  const written = bitWritten(operation);
  return written >= 0 ? [...slots, wires + written] : slots;
}

/** Moves one-wire operations that come right after a wire's start as late as the next thing on it allows. */
function delayBeginnings(
  { operations, wires }: Circuit,
  startNs: Float64Array,
  durationNs: Float64Array,
  totalNs: number,
): void {
  const next = new Float64Array(wires).fill(totalNs);
  const isBeginning = beginnings(operations, wires);
  for (let k = operations.length - 1; k >= 0; k--) {
    const operation = operations[k]!;
    if (isBeginning[k]) {
      startNs[k] = next[operationWires(operation)[0]!]! - durationNs[k]!;
    }
    for (const wire of operationWires(operation)) next[wire] = startNs[k]!;
  }
}

function beginnings(operations: readonly Operation[], wires: number): boolean[] {
  const fresh = new Array<boolean>(wires).fill(true);
  return operations.map((operation) => {
    const operands = operationWires(operation);
    if (operation.kind === 'reset') {
      // the first reset of a wire can wait as well; later ones follow a measurement
      const early = fresh[operation.wire]!;
      fresh[operation.wire] = true;
      return early;
    }
    const stays =
      operation.kind === 'gate' &&
      operands.length === 1 &&
      !operation.condition &&
      fresh[operands[0]!]!;
    if (!stays) for (const wire of operands) fresh[wire] = false;
    return stays;
  });
}

function idlesOf(
  { operations, wires }: Circuit,
  startNs: Float64Array,
  durationNs: Float64Array,
): Idle[] {
  const idles: Idle[] = [];
  // NaN: the wire carries nothing to lose (not begun, measured, or just reset to |0>)
  const freeSince = new Float64Array(wires).fill(Number.NaN);
  operations.forEach((operation, k) => {
    if (operation.kind === 'assign') return;
    for (const wire of operationWires(operation)) {
      const wait = startNs[k]! - freeSince[wire]!;
      if (wait > 0) {
        idles.push({ wire, beforeOperation: k, durationNs: wait });
      }
      freeSince[wire] = startNs[k]! + durationNs[k]!;
      const isEmpty = operation.kind === 'measure' || operation.kind === 'reset';
      if (isEmpty) freeSince[wire] = Number.NaN;
    }
  });
  return idles;
}
