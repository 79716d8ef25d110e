/**
 * Rewrites a circuit in the gates of a native set, exactly.
 *
 * Order of work: (1) gates on three wires or more and gates with extra controls are taken apart (`decompose.ts`); (2)
 * neighbouring gates on the same pair of wires are joined where the pair as a whole needs fewer entanglers than they
 * do one by one; (3) every two-wire gate becomes uses of the entangler with single-wire gates around them (`two-wire.ts`);
 * (4) runs of single-wire gates on a wire are multiplied together and written once, as short as the set allows
 * (`euler.ts`), rotations that pass an entangler where that saves gates (`single-runs.ts`). A native entangler stays where
 * it is.
 * Measurements, resets, barriers, conditions and annotations keep their places: single-wire gates before them are written
 * before them. A conditioned gate becomes conditioned native gates. A frame change right before an unconditional
 * measurement or reset does nothing and is left out.
 * Fails: InputError for gates without an exact way (see `decompose.ts`), and for entanglers that do not entangle.
 */
import {
  type BitExpression,
  type GateOperation,
  gate,
  type Operation,
  operationWires,
} from '../circuit/circuit.ts';
import { gateMatrix } from '../circuit/unitary.ts';
import { InputError } from '../input-error.ts';
import { identity, kron, mul } from '../numeric/complex-matrix.ts';
import { decompose } from './decompose.ts';
import type { NativeSet } from './native-set.ts';
import { type Run, writeRuns } from './single-runs.ts';
import {
  type EntanglerUse,
  entanglerUse,
  type Passing,
  passingOf,
  twoWireGates,
  usesNeeded,
} from './two-wire.ts';

export function toNative(
  operations: readonly Operation[],
  wires: number,
  set: NativeSet,
): Operation[] {
  const use = entanglerUse(set.entangler);
  const small = operations.flatMap((operation) => takenApart(operation));
  const joined = joinPairs(small, wires, use, set);
  const writer = new NativeWriter(wires, set, use);
  for (const operation of joined) writer.add(operation);
  return writer.finish();
}

/** Gates on at most two wires; what the statement carries goes to its first gate. */
function takenApart(operation: Operation): Operation[] {
  if (operation.kind !== 'gate') return [operation];
  const { condition, annotations, line, column } = operation;
  const pieces = decompose(operation);
  if (pieces.length === 1 && pieces[0] === operation) return [operation];
  return pieces.map((piece, k) => ({
    ...piece,
    ...(condition ? { condition } : {}),
    ...(annotations && k === 0 ? { annotations } : {}),
    ...(line === undefined ? {} : { line }),
    ...(column === undefined ? {} : { column }),
  }));
}

function isNativeEntangler(operation: GateOperation, { entangler }: NativeSet): boolean {
  if (operation.wires.length !== 2 || operation.controls.length > 0 || operation.power !== 1) {
    return false;
  }
  if (entangler.matrix) return operation.name === 'unitary' && operation.label === entangler.name;
  return operation.name === entangler.name;
}

/** Uses of the entangler a gate takes when it is written on its own. */
function costOf(operation: GateOperation, set: NativeSet, use: EntanglerUse): number {
  if (isNativeEntangler(operation, set)) return 1;
  return usesNeeded(gateMatrix(operation), use) ?? Number.POSITIVE_INFINITY;
}

type Block = { pair: [number, number]; members: number[]; matrix: Float64Array; cost: number };

/** Replaces runs of plain gates on one pair of wires by one matrix where that saves entanglers. */
function joinPairs(
  operations: readonly Operation[],
  wires: number,
  use: EntanglerUse,
  set: NativeSet,
): Operation[] {
  const openOn: (Block | undefined)[] = new Array(wires).fill(undefined);
  const blocks: Block[] = [];
  const waiting: number[][] = Array.from({ length: wires }, () => []);
  const close = (wire: number): void => {
    const block = openOn[wire];
    if (block) for (const w of block.pair) openOn[w] = undefined;
    waiting[wire] = [];
  };
  operations.forEach((operation, index) => {
    const operands = operationWires(operation);
    const isPlain = operation.kind === 'gate' && !operation.condition && !operation.annotations;
    if (!isPlain || operands.length > 2 || operands.length === 0) {
      for (const wire of operands) close(wire);
      if (operation.kind === 'barrier') for (let w = 0; w < wires; w++) close(w);
      return;
    }
    if (operands.length === 1) {
      const [wire] = operands as [number];
      const block = openOn[wire];
      if (block) extend(block, index, operation, 0);
      else waiting[wire]!.push(index);
      return;
    }
    const [a, b] = operands as [number, number];
    const open = openOn[a];
    if (open && open === openOn[b]) {
      extend(open, index, operation, costOf(operation, set, use));
      return;
    }
    const before = [...waiting[a]!, ...waiting[b]!].sort((x, y) => x - y);
    close(a);
    close(b);
    const block: Block = { pair: [a, b], members: [], matrix: identity(4), cost: 0 };
    for (const k of before) extend(block, k, operations[k] as GateOperation, 0); // single-wire gates
    extend(block, index, operation, costOf(operation, set, use));
    openOn[a] = openOn[b] = block;
    blocks.push(block);
  });
  const dropped = new Set<number>();
  const replaced = new Map<number, GateOperation>();
  for (const { pair, members, matrix, cost } of blocks) {
    if (members.length < 2) continue;
    const needed = usesNeeded(matrix, use);
    if (needed === undefined || needed >= cost) continue;
    // the joined gate stands where the first two-wire member stood, and the single-wire ones go into it
    for (const k of members) dropped.add(k);
    const place = members.find((k) => operationWires(operations[k]!).length === 2)!; // a block has one
    replaced.set(place, { ...gate('unitary', pair), matrix, label: 'pair' });
  }
  return operations.flatMap((operation, k) => {
    const joined = replaced.get(k);
    if (joined) return [joined];
    return dropped.has(k) ? [] : [operation];
  });
}

function extend(block: Block, index: number, operation: GateOperation, cost: number): void {
  const [a, b] = block.pair;
  const matrix = gateMatrix(operation);
  let wide = matrix;
  if (operation.wires.length === 1) {
    const isFirst = operation.wires[0] === a;
    wide = isFirst ? kron(matrix, identity(2), 2, 2) : kron(identity(2), matrix, 2, 2);
  } else if (operation.wires[0] === b) wide = swapped(matrix);
  block.members.push(index);
  block.matrix = mul(wide, block.matrix, 4);
  block.cost += cost;
}

/** The same gate with its two operands exchanged. */
function swapped(matrix: Float64Array): Float64Array {
  const order = [0, 2, 1, 3];
  const out = new Float64Array(32);
  for (const base of [0, 16]) {
    for (let i = 0; i < 4; i++) {
      for (let j = 0; j < 4; j++) out[base + i * 4 + j] = matrix[base + order[i]! * 4 + order[j]!]!;
    }
  }
  return out;
}

/** Writes operations in order; single-wire gates are gathered in runs and written last, all of a wire together. */
class NativeWriter {
  private readonly out: (Operation | { wire: number; run: number })[] = [];
  private readonly pending: (Float64Array | undefined)[];
  private readonly runs: Run[][];
  private readonly set: NativeSet;
  private readonly use: EntanglerUse;
  private readonly passing: Passing;

  constructor(wires: number, set: NativeSet, use: EntanglerUse) {
    this.pending = new Array(wires).fill(undefined);
    this.runs = Array.from({ length: wires }, () => []);
    this.set = set;
    this.use = use;
    this.passing = passingOf(set.entangler);
  }

  add(operation: Operation): void {
    if (operation.kind !== 'gate') {
      const isEnd = operation.kind === 'measure' || operation.kind === 'reset';
      const isFree = isEnd && !operation.condition;
      const touched = operation.kind === 'barrier' ? operation.wires : operationWires(operation);
      for (const wire of touched) this.flush(wire, { kind: isFree ? operation.kind : 'hard' });
      this.out.push(operation);
      return;
    }
    const carries = operation.condition !== undefined || operation.annotations !== undefined;
    if (carries) {
      for (const wire of operation.wires) this.flush(wire, { kind: 'hard' });
      this.addCarrying(operation);
      return;
    }
    if (operation.wires.length === 1) {
      this.multiply(operation.wires[0]!, gateMatrix(operation));
      return;
    }
    for (const piece of this.piecesOf(operation)) {
      if (piece.wires.length === 1) this.multiply(piece.wires[0]!, gateMatrix(piece));
      else {
        piece.wires.forEach((wire, side) => {
          const passing = this.passing[side];
          this.flush(wire, passing ? { kind: 'pass', ...passing } : { kind: 'hard' });
        });
        this.out.push(piece);
      }
    }
  }

  /** A gate with a condition or annotations: its native gates carry them too. */
  private addCarrying(operation: GateOperation): void {
    const { condition, annotations } = operation;
    const plain: GateOperation = { ...operation };
    delete plain.condition;
    delete plain.annotations;
    const inner = new NativeWriter(this.pending.length, this.set, this.use);
    inner.add(plain);
    inner.finish().forEach((piece, k) => {
      this.out.push({
        ...piece,
        ...(condition ? { condition: condition satisfies BitExpression } : {}),
        ...(annotations && k === 0 ? { annotations } : {}),
      });
    });
  }

  private piecesOf(operation: GateOperation): GateOperation[] {
    if (isNativeEntangler(operation, this.set)) return [operation];
    const pieces = twoWireGates(gateMatrix(operation), this.use);
    if (!pieces) {
      throw new InputError({
        code: 'weak-entangler',
        message: `expected an entangler that makes every two-wire gate in a few uses, got ${this.set.entangler.name}`,
        hint: 'a product of single-wire gates, a swap, and what is near to them will not do',
      });
    }
    return pieces.map((piece) => ({
      ...piece,
      wires: piece.wires.map((wire) => operation.wires[wire]!),
    }));
  }

  private multiply(wire: number, matrix: Float64Array): void {
    const before = this.pending[wire];
    this.pending[wire] = before ? mul(matrix, before, 2) : matrix;
  }

  /** Ends the run of a wire; its gates will stand here. */
  private flush(wire: number, end: Run['end']): void {
    const matrix = this.pending[wire] ?? null;
    this.pending[wire] = undefined;
    this.out.push({ wire, run: this.runs[wire]!.length });
    this.runs[wire]!.push({ matrix, end });
  }

  finish(): Operation[] {
    for (let wire = 0; wire < this.pending.length; wire++) this.flush(wire, { kind: 'hard' });
    const written = this.runs.map((runs) => writeRuns(runs, this.set.oneWire));
    return this.out.flatMap((entry): Operation[] =>
      'run' in entry
        ? written[entry.wire]![entry.run]!.map(({ name, angles }) => gate(name, [entry.wire], ...angles)) // biome-ignore format: one call
        : [entry],
    );
  }
}
