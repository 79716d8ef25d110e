/**
 * Unfolds a circuit with measurements, resets and conditions into one linear map, and evolves that map.
 *
 * Shape: the map is 2^a x 2^c, planar, row-major: rows are the states of a axes (oldest = most significant), columns
 * the basis states of the c inputs that are `any` (in order of entry; `columnInputs` names them).
 * Convention: every reset starts a fresh axis; a measured wire ends in its axis, which is then only read (a
 * condition becomes a control); what is measured and used again without reset is first copied to an axis of its
 * own. Bits are boolean expressions over axes. So the circuit is an isometry from its inputs to axes, and what an
 * observer can see is a function of some axes, the others being traced out (deferred measurement; Nielsen,
 * Chuang, section 4.4).
 * Annotations: `wiregauge.enters k` at a reset puts input k there; `wiregauge.leaves i` at a measurement (or, for a
 * dropped output, before the next reset of the wire) says which output the wire carries. Without annotations wire
 * k carries input k and output k.
 * Cost: 2^(a + c) per gate. Limit: a + c <= `UNFOLDED_BITS_MAX`, InputError `too-large` beyond.
 */
import {
  type BitExpression,
  bitsOf,
  type Circuit,
  evaluateBits,
  type GateOperation,
  type Operation,
} from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';
import { applyMatrixInto, baseMatrix } from '../circuit/unitary.ts';
import type { Contract } from '../contract.ts';
import { InputError } from '../input-error.ts';
import { mul } from '../numeric/complex-matrix.ts';
import { entering, isAnnotated, leaving } from './annotations.ts';
import { combined, negated, substituted } from './bit-terms.ts';

/** 2^24 complex numbers, 256 MiB, for each of the two circuits. */
export const UNFOLDED_BITS_MAX = 24;

const PAULI_X = new Float64Array([0, 1, 1, 0, 0, 0, 0, 0]);
const SWAP = new Float64Array(32);
for (const at of [0, 6, 9, 15]) SWAP[at] = 1;

export type Unfolded = {
  /** Number of axes a. */
  axes: number;
  columnInputs: readonly number[];
  data: Float64Array;
  /** Axis of each output of the original that the circuit hands on, -1 where it is unknown. */
  outputAxis: Int32Array;
  /** Final value of every bit of this circuit, as an expression over axes (`bit` = axis number). */
  bits: readonly BitExpression[];
  /** Number of qubits that a circuit without reuse would have had. */
  unfoldedWires: number;
};

/** At least this many bits of state index: known before anything is evolved. */
export function unfoldedBitsLeast(circuit: Circuit, contract: Contract): number {
  const anyInputs = contract.inputs.filter((rule) => rule === 'any').length;
  const annotated = isAnnotated(circuit);
  const resets = circuit.operations.filter(({ kind }) => kind === 'reset').length;
  const copied = measurementsToCopy(circuit, contract, annotated);
  circuit.operations.forEach(({ kind, condition }, k) => {
    if (kind === 'measure' && condition) copied.add(k);
  });
  return anyInputs + resets + copied.size + (annotated ? 0 : circuit.wires);
}

/** Evolves the circuit; `inputs` rules are those of the original's wires. */
export function unfold(circuit: Circuit, contract: Contract): Unfolded {
  const least = unfoldedBitsLeast(circuit, contract);
  if (least > UNFOLDED_BITS_MAX) throw tooLarge(least, circuit.name);
  const run = new Unfolding(circuit, contract);
  circuit.operations.forEach((operation, k) => {
    run.step(operation, k);
  });
  return run.finish();
}

/** Gates are applied to this many columns at a time. */
const BLOCK_COLUMNS = 16;

/** A matrix for the rows where (row & mask) = value, in the axes of the moment. */
type Waiting = { matrix: Float64Array; targets: readonly number[]; mask: number; value: number };

class Unfolding {
  private data: Float64Array = new Float64Array([1, 0]);
  private axes = 0;
  private fresh = 0;
  private readonly columnInputs: number[] = [];
  private readonly axisOfWire: Int32Array;
  private readonly outputAxis: Int32Array;
  private readonly entered: Set<number> = new Set();
  private readonly bits: BitExpression[];
  private readonly pending: Waiting[] = [];
  private readonly circuit: Circuit;
  private readonly contract: Contract;
  private readonly isAnnotated: boolean;
  private readonly mustCopy: ReadonlySet<number>;

  constructor(circuit: Circuit, contract: Contract) {
    this.circuit = circuit;
    this.contract = contract;
    this.isAnnotated = isAnnotated(circuit);
    this.mustCopy = measurementsToCopy(circuit, contract, this.isAnnotated);
    this.axisOfWire = new Int32Array(circuit.wires).fill(-1);
    this.outputAxis = new Int32Array(contract.outputs.length).fill(-1);
    this.bits = Array.from({ length: circuit.bits }, () => ({ kind: 'constant', value: false }));
    if (this.isAnnotated) return;
    for (let wire = 0; wire < circuit.wires; wire++) {
      this.axisOfWire[wire] = this.start(contract.inputs[wire] ?? 'zero', wire);
    }
  }

  private start(rule: 'any' | 'zero', input: number): number {
    if (rule === 'zero') return this.addAxis();
    this.flush();
    this.checkSize(2);
    const c = 2 ** this.columnInputs.length;
    const rows = 2 ** this.axes;
    const out = new Float64Array(4 * this.data.length);
    const [from, to] = [rows * c, 4 * rows * c];
    for (const part of [0, 1]) {
      for (let r = 0; r < rows; r++) {
        for (let k = 0; k < c; k++) {
          const x = this.data[part * from + r * c + k]!;
          if (x === 0) continue;
          const at = part * to + 2 * r * (2 * c) + 2 * k;
          out[at] = x;
          out[at + 2 * c + 1] = x;
        }
      }
    }
    this.data = out;
    this.columnInputs.push(input);
    this.fresh++;
    return this.axes++;
  }

  /** A new axis in |0>. */
  private addAxis(isCopy = false): number {
    this.flush();
    this.checkSize(1);
    const c = 2 ** this.columnInputs.length;
    const rows = 2 ** this.axes;
    const out = new Float64Array(2 * this.data.length);
    for (const part of [0, 1]) {
      for (let r = 0; r < rows; r++) {
        const from = part * rows * c + r * c;
        out.set(this.data.subarray(from, from + c), part * 2 * rows * c + 2 * r * c);
      }
    }
    this.data = out;
    if (!isCopy) this.fresh++;
    return this.axes++;
  }

  private checkSize(more: number): void {
    const wanted = this.axes + this.columnInputs.length + more;
    if (wanted <= UNFOLDED_BITS_MAX) return;
    throw tooLarge(wanted, this.circuit.name);
  }

  private axisFor(wire: number): number {
    if (this.axisOfWire[wire]! < 0) this.axisOfWire[wire] = this.addAxis();
    return this.axisOfWire[wire]!;
  }

  step(operation: Operation, index: number): void {
    const condition = operation.condition && this.overAxes(operation.condition);
    switch (operation.kind) {
      case 'barrier':
        return;
      case 'assign': {
        const value = this.overAxes(operation.value);
        this.bits[operation.bit] = chosen(condition, value, this.bits[operation.bit]!);
        return;
      }
      case 'gate':
        this.gate(operation, condition);
        return;
      case 'measure':
        this.leave(operation, this.measure(operation.wire, operation.bit, index, condition));
        return;
      case 'reset':
        if (leaving(operation) >= 0) this.leave(operation, this.axisFor(operation.wire));
        this.reset(operation, condition);
        return;
    }
  }

  private leave(operation: Operation, axis: number): void {
    const output = leaving(operation);
    if (output < 0) return;
    if (output >= this.outputAxis.length || this.outputAxis[output]! >= 0) {
      throw this.problem(operation, `expected each output to leave once, got leaves ${output}`);
    }
    this.outputAxis[output] = axis;
  }

  private problem(operation: Operation, message: string): InputError {
    const { line, column } = operation;
    return new InputError({
      code: 'bad-annotation',
      message,
      file: this.circuit.name,
      ...(line === undefined ? {} : { line }),
      ...(column === undefined ? {} : { column }),
    });
  }

  private reset(operation: Operation, condition: BitExpression | undefined): void {
    if (operation.kind !== 'reset') return;
    const { wire } = operation;
    const input = entering(operation);
    if (condition) {
      if (input >= 0) throw this.problem(operation, 'expected no condition where an input enters');
      const axis = this.axisFor(wire);
      const zero = this.addAxis(true);
      this.applyWhere(SWAP, [axis, zero], condition, 0, 0);
      return;
    }
    if (input < 0) {
      this.axisOfWire[wire] = this.addAxis();
      return;
    }
    if (input >= this.contract.inputs.length || this.entered.has(input)) {
      throw this.problem(operation, `expected each input to enter once, got enters ${input}`);
    }
    this.entered.add(input);
    this.axisOfWire[wire] = this.start(this.contract.inputs[input]!, input);
  }

  private measure(
    wire: number,
    bit: number,
    index: number,
    condition: BitExpression | undefined,
  ): number {
    let axis = this.axisFor(wire);
    if (this.mustCopy.has(index) || condition) {
      const copy = this.addAxis(true);
      const size = this.axes;
      const control = 2 ** (size - 1 - axis);
      this.applyWhere(PAULI_X, [copy], condition, control, control);
      axis = copy;
    }
    if (bit >= 0) this.bits[bit] = chosen(condition, { kind: 'bit', bit: axis }, this.bits[bit]!);
    return axis;
  }

  private gate(operation: GateOperation, condition: BitExpression | undefined): void {
    const axes = operation.wires.map((wire) => this.axisFor(wire));
    const controls = operation.controls.length;
    let [mask, value] = [0, 0];
    operation.controls.forEach((isOn, k) => {
      const bit = 2 ** (this.axes - 1 - axes[k]!);
      mask += bit;
      if (isOn) value += bit;
    });
    this.applyWhere(baseMatrix(operation), axes.slice(controls), condition, mask, value);
  }

  /** Applies a matrix on the rows where the condition holds and (row & mask) = value. */
  private applyWhere(
    matrix: Float64Array,
    targets: readonly number[],
    condition: BitExpression | undefined,
    mask: number,
    value: number,
  ): void {
    const columns = 2 ** this.columnInputs.length;
    const read = bitsOf(condition);
    if (!condition || read.length === 0) {
      if (condition && !evaluateBits(condition, () => false)) return;
      this.pending.push({ matrix, targets, mask, value });
      return;
    }
    this.flush();
    for (const axis of read) {
      if (targets.includes(axis)) {
        throw new InputError({
          code: 'condition-on-itself',
          message:
            'expected a condition on bits of other wires, got one that a gate on the same measured wire depends on',
          file: this.circuit.name,
        });
      }
    }
    for (let k = 0; k < 2 ** read.length; k++) {
      const isOne = (axis: number): boolean => ((k >> read.indexOf(axis)) & 1) === 1;
      if (!evaluateBits(condition, isOne)) continue;
      let [m, v] = [mask, value];
      let isPossible = true;
      for (const axis of read) {
        const bit = 2 ** (this.axes - 1 - axis);
        const wanted = isOne(axis) ? bit : 0;
        if (mask & bit && (value & bit) !== wanted) isPossible = false;
        if (!(m & bit)) {
          m += bit;
          v += wanted;
        }
      }
      if (isPossible) applyMatrixInto(this.data, matrix, targets, this.axes, columns, m, v);
    }
  }

  /** Applies the gates that wait, to a few columns at a time so that these stay in the cache. */
  private flush(): void {
    const waiting = joined(this.pending.splice(0), this.axes);
    if (waiting.length === 0) return;
    const columns = 2 ** this.columnInputs.length;
    const apply = (data: Float64Array, width: number): void => {
      for (const { matrix, targets, mask, value } of waiting) {
        applyMatrixInto(data, matrix, targets, this.axes, width, mask, value);
      }
    };
    const parts = 2 ** (this.axes + 1);
    if (columns <= BLOCK_COLUMNS || waiting.length < 4) {
      apply(this.data, columns);
      return;
    }
    const block = new Float64Array(parts * BLOCK_COLUMNS);
    for (let first = 0; first < columns; first += BLOCK_COLUMNS) {
      for (let row = 0; row < parts; row++) {
        const from = row * columns + first;
        block.set(this.data.subarray(from, from + BLOCK_COLUMNS), row * BLOCK_COLUMNS);
      }
      apply(block, BLOCK_COLUMNS);
      for (let row = 0; row < parts; row++) {
        const from = row * BLOCK_COLUMNS;
        this.data.set(block.subarray(from, from + BLOCK_COLUMNS), row * columns + first);
      }
    }
  }

  private overAxes(expression: BitExpression): BitExpression {
    return substituted(expression, (bit) => this.bits[bit]!);
  }

  finish(): Unfolded {
    this.flush();
    const { globalPhase } = this.circuit;
    if (globalPhase !== 0) {
      const half = this.data.length / 2;
      const [c, s] = [Math.cos(globalPhase), Math.sin(globalPhase)];
      for (let k = 0; k < half; k++) {
        const [x, y] = [this.data[k]!, this.data[half + k]!];
        this.data[k] = c * x - s * y;
        this.data[half + k] = c * y + s * x;
      }
    }
    if (!this.isAnnotated) {
      for (let wire = 0; wire < this.outputAxis.length && wire < this.circuit.wires; wire++) {
        this.outputAxis[wire] = this.axisFor(wire);
      }
    }
    // inputs that never entered: nothing depends on them
    this.contract.inputs.forEach((rule, input) => {
      if (this.isAnnotated && rule === 'any' && !this.entered.has(input)) this.start('any', input);
    });
    return {
      axes: this.axes,
      columnInputs: this.columnInputs,
      data: this.data,
      outputAxis: this.outputAxis,
      bits: this.bits,
      unfoldedWires: this.fresh,
    };
  }
}

/** Gates on one target in a row are one gate. */
function joined(waiting: readonly Waiting[], axes: number): Waiting[] {
  const out: Waiting[] = [];
  /** For each target the place in `out` of a gate on it alone that nothing has followed yet. */
  const open = new Map<number, number>();
  for (const gate of waiting) {
    const [target] = gate.targets;
    if (gate.mask === 0 && gate.targets.length === 1) {
      const at = open.get(target!);
      if (at !== undefined) {
        out[at] = { ...out[at]!, matrix: mul(gate.matrix, out[at]!.matrix, 2) };
        continue;
      }
      open.set(target!, out.length);
    } else {
      for (const axis of open.keys()) {
        if (gate.targets.includes(axis) || gate.mask & (2 ** (axes - 1 - axis))) open.delete(axis);
      }
    }
    out.push(gate);
  }
  return out;
}

function tooLarge(bits: number, file: string): InputError {
  return new InputError({
    code: 'too-large',
    message: `dense comparison needs 2^${bits} or more complex numbers; 2^${UNFOLDED_BITS_MAX} is the limit here`,
    file,
  });
}

function chosen(
  condition: BitExpression | undefined,
  value: BitExpression,
  otherwise: BitExpression,
): BitExpression {
  if (!condition) return value;
  return combined('or', [
    combined('and', [condition, value]),
    combined('and', [negated(condition), otherwise]),
  ]);
}

/**
 * Measurements whose wire is changed again before it is reset, or handed on as a kept output: their outcome needs an
 * axis of its own (somebody who keeps the qubit sees that it was measured).
 */
function measurementsToCopy(
  { operations, wires }: Circuit,
  { outputs }: Contract,
  annotated: boolean,
): Set<number> {
  const found = new Set<number>();
  const isChangedLater = new Uint8Array(wires);
  if (!annotated) {
    for (let wire = 0; wire < wires; wire++) if (outputs[wire] === 'kept') isChangedLater[wire] = 1;
  }
  for (let k = operations.length - 1; k >= 0; k--) {
    const operation = operations[k]!;
    if (operation.kind === 'reset') isChangedLater[operation.wire] = operation.condition ? 1 : 0;
    else if (operation.kind === 'measure' && isChangedLater[operation.wire]) found.add(k);
    else if (operation.kind === 'gate') {
      const entry = gateTable.get(operation.name);
      const controls = operation.controls.length;
      operation.wires.forEach((wire, place) => {
        const isControl =
          operation.condition === undefined &&
          (place < controls ||
            entry?.diagonal === true ||
            (operation.power === 1 && entry?.controlOperands.includes(place - controls) === true));
        if (!isControl) isChangedLater[wire] = 1;
      });
    }
    const isHandedOn = outputs[leaving(operation)] === 'kept';
    if (isHandedOn && (operation.kind === 'measure' || operation.kind === 'reset'))
      isChangedLater[operation.wire] = 1;
  }
  return found;
}
