/**
 * Writes a circuit as gates on lines: the qubits themselves, whichever wire carries them.
 *
 * A line is named by the input that enters on it. Swaps only say which line a wire carries; a condition on measured bits
 * becomes a control on the lines that were measured; an XOR of bits into a bit of its own line becomes a CX at the end.
 * Result: null where a circuit is not of this kind (a line measured and then changed, a reset without a name for what
 * enters, a condition on many bits): other roads must take it. With `isUnfolding` the first two become lines of their own,
 * numbered on from the outputs, which start in |0>: a reset starts one, and a measured line that is changed leaves its
 * outcome on one by a CX (deferred measurement: Nielsen, Chuang (2010), 4.4).
 * Shape: matrices are planar, on `lines`, first = most significant.
 */
import {
  type BitExpression,
  bitsOf,
  type Circuit,
  evaluateBits,
  type GateOperation,
  type Operation,
} from '../circuit/circuit.ts';
import { gateMatrix } from '../circuit/unitary.ts';
import { identity } from '../numeric/complex-matrix.ts';
import { entering, leaving } from './annotations.ts';
import { substituted } from './bit-terms.ts';

export type LineGate = {
  lines: readonly number[];
  matrix: Float64Array;
  /** For each line: the gate is block-diagonal in its Z basis, so that it is at most a control there. */
  isControl: readonly boolean[];
  /** Line of the text it comes from. */
  at?: number;
};

export type Lines = {
  gates: LineGate[];
  /** Line that ends as output i, -1 where none is known. */
  lineOfOutput: Int32Array;
  /** Line whose measurement gives the bit, after the XORs; -1 for bits that are never written. */
  lineOfBit: Int32Array;
  /** Lines whose outcome a condition reads. */
  read: Set<number>;
  /** Lines that were measured, not merely marked as leaving: whoever keeps such a qubit sees that. */
  dephased: Set<number>;
  /** Number of lines, those of the inputs first. */
  count: number;
};

const GATE_LINES_MAX = 6;

export function linesOf(
  circuit: Circuit,
  outputs: number,
  isAnnotated: boolean,
  isUnfolding = false,
): Lines | null {
  const run = new LineWalk(circuit, outputs, isAnnotated, isUnfolding);
  for (let k = 0; k < circuit.operations.length; k++) if (!run.step(k)) return null;
  return run.finish();
}

class LineWalk {
  private readonly gates: LineGate[] = [];
  private readonly lineOfWire: Int32Array;
  private readonly lineOfOutput: Int32Array;
  private readonly bits: BitExpression[];
  private readonly lineOfBit: Int32Array;
  /** XORs of bits as CX between their lines, in order; they come after everything else. */
  private readonly xors: LineGate[] = [];
  private readonly measured = new Set<number>();
  private readonly read = new Set<number>();
  private readonly dephased = new Set<number>();
  private readonly entered = new Set<number>();
  private readonly shapes = new Map<string, Pick<LineGate, 'matrix' | 'isControl'>>();
  private readonly circuit: Circuit;
  private readonly isAnnotated: boolean;
  private readonly isUnfolding: boolean;
  private count: number;

  constructor(circuit: Circuit, outputs: number, isAnnotated: boolean, isUnfolding: boolean) {
    this.circuit = circuit;
    this.isAnnotated = isAnnotated;
    this.isUnfolding = isUnfolding;
    this.count = Math.max(outputs, isAnnotated ? 0 : circuit.wires);
    this.lineOfWire = Int32Array.from({ length: circuit.wires }, (_, k) => (isAnnotated ? -1 : k));
    this.lineOfOutput = new Int32Array(outputs).fill(-1);
    this.lineOfBit = new Int32Array(circuit.bits).fill(-1);
    this.bits = Array.from({ length: circuit.bits }, () => ({ kind: 'constant', value: false }));
  }

  /** False when the operation does not fit this road. */
  step(k: number): boolean {
    const operation = this.circuit.operations[k]!;
    switch (operation.kind) {
      case 'barrier':
        return true;
      case 'assign':
        return !operation.condition && this.assign(operation.bit, operation.value);
      case 'gate':
        return this.gate(operation);
      case 'measure': {
        const from = this.lineOfWire[operation.wire]!;
        if (operation.condition || from < 0) return false;
        if (!this.leave(operation, from)) return false;
        // a second measurement of an outcome that a bit holds already
        const isAgain = this.isUnfolding && this.measured.has(from) && operation.bit >= 0;
        const line = isAgain && this.lineOfBit.includes(from) ? this.copied(from) : from;
        if (operation.bit >= 0) {
          this.bits[operation.bit] = { kind: 'bit', bit: line };
          this.lineOfBit[operation.bit] = line;
        }
        this.measured.add(line);
        if (leaving(operation) < 0) this.dephased.add(from);
        return true;
      }
      case 'reset': {
        const line = this.lineOfWire[operation.wire]!;
        if (operation.condition) return false;
        if (line >= 0 && !this.leave(operation, line)) return false;
        const input = this.isAnnotated ? entering(operation) : -1;
        if (input < 0) return this.isUnfolding && this.fresh(operation.wire);
        this.lineOfWire[operation.wire] = input;
        if (this.entered.has(input)) return false;
        this.entered.add(input);
        return true;
      }
    }
  }

  /** A line of its own, in |0>, on a wire. */
  private fresh(wire: number): true {
    this.lineOfWire[wire] = this.count++;
    return true;
  }

  /** `b = b ^ c ^ ...` is kept as CX from the other bits' lines; every other value is not for this road. */
  private assign(bit: number, value: BitExpression): boolean {
    const parts = value.kind === 'xor' ? value.of : [];
    const read = parts.flatMap((part) => (part.kind === 'bit' ? [part.bit] : []));
    const others = read.filter((other) => other !== bit);
    const isXor = read.length === parts.length && others.length === read.length - 1;
    const target = this.lineOfBit[bit]!;
    const controls = others.map((other) => this.lineOfBit[other]!);
    if (!isXor || target < 0 || controls.some((line) => line < 0 || line === target)) return false;
    for (const control of controls) this.xors.push(lineGate([control, target], CX));
    this.bits[bit] = this.overLines(value);
    return true;
  }

  /** False when the output left before, or is none of the original's. */
  private leave(operation: Operation, line: number): boolean {
    const output = leaving(operation);
    if (output < 0) return true;
    if (output >= this.lineOfOutput.length || this.lineOfOutput[output]! >= 0) return false;
    this.lineOfOutput[output] = line;
    return true;
  }

  private gate(operation: GateOperation): boolean {
    const lines = operation.wires.map((wire) => this.lineOfWire[wire]!);
    if (lines.some((line) => line < 0)) return false;
    const isSwap =
      operation.name === 'swap' && operation.controls.length === 0 && operation.power === 1;
    if (isSwap && !operation.condition) {
      const [a, b] = operation.wires as [number, number];
      this.lineOfWire[a] = lines[1]!;
      this.lineOfWire[b] = lines[0]!;
      return true;
    }
    const { condition } = operation;
    const isOwn = (line: number): boolean => lines.includes(line);
    if (condition) bitsOf(this.overLines(condition)).filter(isOwn).every((line) => this.setAside(line)); // biome-ignore format: one step
    const read = condition ? this.overLines(condition) : undefined;
    const controls = bitsOf(read);
    for (const line of controls) this.read.add(line);
    if (controls.length + lines.length > GATE_LINES_MAX) return false;
    if (controls.some(isOwn)) return false;
    const at = operation.line === undefined ? {} : { at: operation.line };
    const all = [...controls, ...lines];
    const gate = read
      ? {
          ...lineGate(all, conditioned(gateMatrix(operation), lines.length, controls, read)),
          ...at,
        }
      : { ...this.shaped(operation, lines), ...at };
    // a measured line may only be read: a control, never a target
    for (const [k, line] of gate.lines.entries()) {
      if (this.measured.has(line) && !gate.isControl[k] && !this.setAside(line)) return false;
    }
    this.gates.push(gate);
    return true;
  }

  /** The gate on its lines; gates of one name and shape share their matrices. */
  private shaped(operation: GateOperation, lines: readonly number[]): LineGate {
    if (operation.matrix) return lineGate(lines, gateMatrix(operation));
    const { name, angles, power, controls } = operation;
    const order = [...lines].sort((a, b) => a - b);
    const key = [
      name,
      power,
      ...angles,
      ...controls,
      ...lines.map((line) => order.indexOf(line)),
    ].join();
    let shape = this.shapes.get(key);
    if (!shape) {
      const { matrix, isControl } = lineGate(lines, gateMatrix(operation));
      shape = { matrix, isControl };
      this.shapes.set(key, shape);
    }
    return { lines: order, ...shape };
  }

  /** A new line with the outcome of a measured one. */
  private copied(line: number): number {
    const copy = this.count++;
    this.gates.push(lineGate([line, copy], CX));
    return copy;
  }

  /** A measured line is about to change: its outcome goes to a line of its own. False where that is not wanted. */
  private setAside(line: number): boolean {
    // as a kept output it is a qubit, which cannot be copied
    if (!this.isUnfolding || this.lineOfOutput.includes(line) || this.xors.length > 0) return false;
    const copy = this.copied(line);
    for (const [bit, from] of this.lineOfBit.entries()) {
      if (from === line) this.lineOfBit[bit] = copy;
    }
    const rename = (expression: BitExpression): BitExpression => {
      switch (expression.kind) {
        case 'constant':
          return expression;
        case 'bit':
          return expression.bit === line ? { kind: 'bit', bit: copy } : expression;
        case 'not':
          return { kind: 'not', of: rename(expression.of) };
        default:
          return { kind: expression.kind, of: expression.of.map(rename) };
      }
    };
    this.bits.forEach((expression, bit) => {
      this.bits[bit] = rename(expression);
    });
    this.measured.delete(line);
    this.dephased.delete(line);
    this.measured.add(copy);
    if (this.read.delete(line)) this.read.add(copy);
    return true;
  }

  private overLines(expression: BitExpression): BitExpression {
    return substituted(expression, (bit) => this.bits[bit]!);
  }

  finish(): Lines {
    this.lineOfWire.forEach((line, wire) => {
      if (!this.isAnnotated && wire < this.lineOfOutput.length) this.lineOfOutput[wire] = line;
    });
    this.gates.push(...this.xors);
    const { gates, lineOfOutput, lineOfBit, read, dephased, count } = this;
    return { gates, lineOfOutput, lineOfBit, read, dephased, count };
  }
}

const CX = new Float64Array(32);
for (const at of [0, 5, 11, 14]) CX[at] = 1;

/** The matrix on controls and targets: the gate where the condition holds, else nothing. */
function conditioned(
  matrix: Float64Array,
  targets: number,
  controls: readonly number[],
  condition: BitExpression,
): Float64Array {
  const d = 2 ** targets;
  const size = d * 2 ** controls.length;
  const out = identity(size);
  for (let state = 0; state < 2 ** controls.length; state++) {
    const isOne = (line: number): boolean =>
      ((state >> (controls.length - 1 - controls.indexOf(line))) & 1) === 1;
    if (!evaluateBits(condition, isOne)) continue;
    for (let r = 0; r < d; r++) {
      for (let c = 0; c < d; c++) {
        const to = (state * d + r) * size + state * d + c;
        out[to] = matrix[r * d + c]!;
        out[size * size + to] = matrix[d * d + r * d + c]!;
      }
    }
  }
  return out;
}

/** A gate on lines in ascending order, with what is known of each. */
export function lineGate(lines: readonly number[], matrix: Float64Array): LineGate {
  const order = lines.map((_, k) => k).sort((a, b) => lines[a]! - lines[b]!);
  const k = lines.length;
  const d = 2 ** k;
  const moved = new Float64Array(2 * d * d);
  const place = (state: number): number =>
    order.reduce((sum, from, to) => sum + (((state >> (k - 1 - to)) & 1) << (k - 1 - from)), 0);
  const at = Array.from({ length: d }, (_, state) => place(state));
  for (let r = 0; r < d; r++) {
    for (let c = 0; c < d; c++) {
      moved[r * d + c] = matrix[at[r]! * d + at[c]!]!;
      moved[d * d + r * d + c] = matrix[d * d + at[r]! * d + at[c]!]!;
    }
  }
  const sorted = order.map((from) => lines[from]!);
  const isControl = sorted.map((_, line) => isBlockDiagonal(moved, k, line));
  return { lines: sorted, matrix: moved, isControl };
}

function isBlockDiagonal(matrix: Float64Array, k: number, line: number): boolean {
  const d = 2 ** k;
  const bit = 2 ** (k - 1 - line);
  for (let r = 0; r < d; r++) {
    for (let c = 0; c < d; c++) {
      if ((r & bit) === (c & bit)) continue;
      if (Math.abs(matrix[r * d + c]!) + Math.abs(matrix[d * d + r * d + c]!) > 1e-15) return false;
    }
  }
  return true;
}
