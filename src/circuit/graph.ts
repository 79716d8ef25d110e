/**
 * The dependency graph of a circuit: which operations must come before which.
 *
 * An operation depends on the last earlier operation on each of its wires, on the writer of every bit it
 * reads, and, before it overwrites a bit, on the bit's last writer and readers. Stored as compressed rows
 * (`start[k] .. start[k+1]` index into `before`), so that 100,000 operations take a few megabytes.
 */
import { bitsRead, bitWritten, type Circuit, operationWires } from './circuit.ts';

export type DependencyGraph = {
  /** Number of operations. */
  size: number;
  /** Row pointers into `before`, length size + 1. */
  start: Int32Array;
  /** Direct predecessors, each once per row, ascending. */
  before: Int32Array;
};

export function dependencyGraph(circuit: Circuit): DependencyGraph {
  const { wires, bits, operations } = circuit;
  const lastOnWire = new Int32Array(wires).fill(-1);
  const writerOfBit = new Int32Array(bits).fill(-1);
  const readersOfBit: number[][] = Array.from({ length: bits }, () => []);
  const start = new Int32Array(operations.length + 1);
  const before: number[] = [];
  operations.forEach((operation, index) => {
    const found = new Set<number>();
    for (const wire of operationWires(operation)) {
      if (lastOnWire[wire]! >= 0) found.add(lastOnWire[wire]!);
      lastOnWire[wire] = index;
    }
    const read = bitsRead(operation);
    for (const bit of read) if (writerOfBit[bit]! >= 0) found.add(writerOfBit[bit]!);
    const written = bitWritten(operation);
    if (written >= 0) {
      if (writerOfBit[written]! >= 0) found.add(writerOfBit[written]!);
      for (const reader of readersOfBit[written]!) found.add(reader);
      readersOfBit[written] = [];
      writerOfBit[written] = index;
    }
    for (const bit of read) if (bit !== written) readersOfBit[bit]!.push(index);
    found.delete(index);
    before.push(...[...found].sort((a, b) => a - b));
    start[index + 1] = before.length;
  });
  return { size: operations.length, start, before: Int32Array.from(before) };
}
