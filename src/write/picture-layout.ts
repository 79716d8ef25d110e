/**
 * Places the operations of a circuit on a grid: wires are rows from top to bottom, time runs to the right.
 *
 * An operation stands in the leftmost column in which every row between its first and its last wire is
 * still free, so nothing is ever drawn through anything else. A measurement or a condition reaches down to
 * the line of its bit register when there are few bits (`lines`); with many, the bit is written beside it
 * (`tags`) and no row below is blocked. Everything a picture or a page needs to link a gate, its line of
 * text and its wires is in the result.
 *
 * Lifespans: which qubit of the original circuit a wire carries, from the annotations `wiregauge.enters`
 * and `wiregauge.leaves`. Brackets: the runs of gates between two such events, when they are long enough to
 * be worth a name; a bracketed run has columns of its own.
 */
import {
  bitsRead,
  bitWritten,
  type Circuit,
  type Operation,
  operationWires,
} from '../circuit/circuit.ts';

export type PlacedOperation = {
  /** Index in `circuit.operations`. */
  index: number;
  column: number;
  /** Wires in the order of the operation. */
  wires: readonly number[];
  /** First and last row it covers; rows after the wires are bit registers. */
  top: number;
  bottom: number;
  /** Line of the text it was read from, when it was. */
  line?: number;
  /** Original qubit that begins or ends here. */
  enters?: number;
  leaves?: number;
};

/** A stretch of a wire that carries one qubit of the original circuit. */
export type Lifespan = {
  wire: number;
  /** Input that entered and output that left; -1 where the text does not say. */
  enters: number;
  leaves: number;
  /** Columns, both included. */
  from: number;
  to: number;
};

export type Bracket = { label: string; from: number; to: number; operations: number[] };

export type PictureLayout = {
  wires: number;
  /** Wires and, below them, one row for each bit register that is drawn. */
  rows: number;
  columns: number;
  classical: 'lines' | 'tags' | 'none';
  placed: PlacedOperation[];
  lifespans: Lifespan[];
  brackets: Bracket[];
};

export type LayoutOptions = {
  /** How bits are shown; by default lines for up to `bitsMax` bits, tags beyond. */
  classical?: 'lines' | 'tags';
  /** Whether to bracket the runs of gates between wire events. Default true. */
  brackets?: boolean;
};

/** More bits than this are written beside their measurements. */
const bitsMax = 8;
/** Shorter runs of gates get no bracket. */
const bracketGatesMin = 6;

/** Number after `wiregauge.enters` or `wiregauge.leaves` in the annotations of an operation, or undefined. */
export function annotatedQubit(
  operation: Operation,
  event: 'enters' | 'leaves',
): number | undefined {
  for (const annotation of operation.annotations ?? []) {
    const match = /^wiregauge\.(enters|leaves)\s+(\d+)\s*$/.exec(annotation);
    if (match && match[1] === event) return Number(match[2]);
  }
  return undefined;
}

export function layoutCircuit(circuit: Circuit, options: LayoutOptions = {}): PictureLayout {
  const { wires, bits, operations } = circuit;
  const hasAssignments = operations.some(({ kind }) => kind === 'assign');
  const usesBits = operations.some((op) => bitWritten(op) >= 0 || bitsRead(op).length > 0);
  const classical = !usesBits
    ? 'none'
    : (options.classical ?? (bits <= bitsMax ? 'lines' : 'tags'));
  const bitRows = classical === 'lines' ? circuit.bitRegisters.length : hasAssignments ? 1 : 0;
  const rows = wires + bitRows;
  const rowOfBit = (bit: number): number =>
    classical === 'tags'
      ? wires
      : wires +
        circuit.bitRegisters.findIndex(({ first, size }) => bit >= first && bit < first + size);

  const free = new Int32Array(Math.max(rows, 1));
  const freeOfBit = new Int32Array(bits);
  const runs = options.brackets === false ? [] : gateRuns(operations);
  const runOf = new Map<number, number>();
  runs.forEach((run, k) => {
    for (const index of run) runOf.set(index, k);
  });
  const brackets: Bracket[] = [];
  const placed: PlacedOperation[] = [];
  let columns = 0;
  let fence = 0;
  let openRun = -1;

  operations.forEach((operation, index) => {
    const run = runOf.get(index) ?? -1;
    if (run !== openRun) {
      // a bracketed run begins or ends: what follows starts to the right of all that is there
      fence = columns;
      openRun = run;
      if (run >= 0) {
        const label = `block ${brackets.length + 1}`;
        brackets.push({ label, from: columns, to: columns, operations: [] });
      }
    }
    const own = operationWires(operation);
    const touchedBits = [...bitsRead(operation)];
    const written = bitWritten(operation);
    if (written >= 0) touchedBits.push(written);
    const covered = [...own];
    if (classical === 'lines') covered.push(...touchedBits.map(rowOfBit));
    else if (operation.kind === 'assign') covered.push(wires);
    if (covered.length === 0) return;
    const top = Math.min(...covered);
    const bottom = Math.max(...covered);
    let column = fence;
    for (let row = top; row <= bottom; row++) column = Math.max(column, free[row]!);
    for (const bit of touchedBits) column = Math.max(column, freeOfBit[bit]!);
    for (let row = top; row <= bottom; row++) free[row] = column + 1;
    for (const bit of touchedBits) freeOfBit[bit] = column + 1;
    columns = Math.max(columns, column + 1);
    const enters = annotatedQubit(operation, 'enters');
    const leaves = annotatedQubit(operation, 'leaves');
    placed.push({
      index,
      column,
      wires: own,
      top,
      bottom,
      ...(operation.line === undefined ? {} : { line: operation.line }),
      ...(enters === undefined ? {} : { enters }),
      ...(leaves === undefined ? {} : { leaves }),
    });
    const bracket = run >= 0 ? brackets.at(-1) : undefined;
    if (bracket) {
      bracket.to = columns - 1;
      bracket.operations.push(index);
    }
  });
  return {
    wires,
    rows,
    columns,
    classical,
    placed,
    lifespans: lifespansOf(placed, wires, columns),
    brackets,
  };
}

/** Runs of at least `bracketGatesMin` gates between two wire events; none without such events. */
function gateRuns(operations: readonly Operation[]): number[][] {
  const runs: number[][] = [];
  let current: number[] = [];
  let events = 0;
  const close = (): void => {
    if (current.length >= bracketGatesMin) runs.push(current);
    current = [];
  };
  operations.forEach((operation, index) => {
    const isEvent =
      annotatedQubit(operation, 'enters') !== undefined ||
      annotatedQubit(operation, 'leaves') !== undefined;
    if (isEvent) {
      events++;
      close();
    } else if (operation.kind === 'gate') current.push(index);
  });
  close();
  return events > 0 ? runs : [];
}

function lifespansOf(
  placed: readonly PlacedOperation[],
  wires: number,
  columns: number,
): Lifespan[] {
  const spans: Lifespan[] = [];
  const open: (Lifespan | undefined)[] = new Array(wires).fill(undefined);
  for (const { wires: own, column, enters, leaves } of placed) {
    if (enters === undefined && leaves === undefined) continue;
    const wire = own[0]!;
    if (leaves !== undefined) {
      const span = open[wire] ?? { wire, enters: -1, leaves, from: 0, to: column };
      // an output that is dropped has left when the next qubit's reset comes
      span.to = enters === undefined ? column : Math.max(span.from, column - 1);
      span.leaves = leaves;
      if (!open[wire]) spans.push(span);
      open[wire] = undefined;
    }
    if (enters !== undefined) {
      const span = { wire, enters, leaves: -1, from: column, to: columns - 1 };
      const before = open[wire];
      if (before) before.to = Math.max(before.from, column - 1);
      spans.push(span);
      open[wire] = span;
    }
  }
  return spans;
}
