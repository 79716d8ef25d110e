/**
 * Writes a circuit as gates on lines: the qubits themselves, whichever wire carries them.
 *
 * A line is named by the input that enters on it. Swaps only say which line a wire carries; a condition on measured bits
 * becomes a control on the lines that were measured; an XOR of bits into a bit of its own line becomes a CX at the end.
 * Result: null where a circuit is not of this kind (a line measured and then changed, a reset without a name for what
 * enters, a condition on many bits): other roads must take it.
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
};

const GATE_LINES_MAX = 6;

export function linesOf(circuit: Circuit, outputs: number, isAnnotated: boolean): Lines | null {
  const run = new LineWalk(circuit, outputs, isAnnotated);
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
  private readonly entered = new Set<number>();
  private readonly circuit: Circuit;
  private readonly isAnnotated: boolean;

  constructor(circuit: Circuit, outputs: number, isAnnotated: boolean) {
    this.circuit = circuit;
    this.isAnnotated = isAnnotated;
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
        const line = this.lineOfWire[operation.wire]!;
        if (operation.condition || line < 0) return false;
        if (!this.leave(operation, line)) return false;
        if (operation.bit >= 0) {
          this.bits[operation.bit] = { kind: 'bit', bit: line };
          this.lineOfBit[operation.bit] = line;
        }
        this.measured.add(line);
        return true;
      }
      case 'reset': {
        const line = this.lineOfWire[operation.wire]!;
        if (operation.condition || !this.isAnnotated) return false;
        if (line >= 0 && !this.leave(operation, line)) return false;
        const input = entering(operation);
        this.lineOfWire[operation.wire] = input;
        if (input < 0 || this.entered.has(input)) return false;
        this.entered.add(input);
        return true;
      }
    }
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
    const read = operation.condition ? this.overLines(operation.condition) : undefined;
    const controls = bitsOf(read);
    for (const line of controls) this.read.add(line);
    if (controls.length + lines.length > GATE_LINES_MAX) return false;
    if (controls.some((line) => lines.includes(line))) return false;
    const matrix = read
      ? conditioned(gateMatrix(operation), lines.length, controls, read)
      : gateMatrix(operation);
    const gate = { ...lineGate([...controls, ...lines], matrix), ...(operation.line === undefined ? {} : { at: operation.line }) }; // biome-ignore format: one gate
    // a measured line may only be read: a control, never a target
    const isFine = gate.lines.every((line, k) => !this.measured.has(line) || gate.isControl[k]);
    if (isFine) this.gates.push(gate);
    return isFine;
  }

  private overLines(expression: BitExpression): BitExpression {
    switch (expression.kind) {
      case 'constant':
        return expression;
      case 'bit':
        return this.bits[expression.bit]!;
      case 'not':
        return { kind: 'not', of: this.overLines(expression.of) };
      default:
        return { kind: expression.kind, of: expression.of.map((part) => this.overLines(part)) };
    }
  }

  finish(): Lines {
    this.lineOfWire.forEach((line, wire) => {
      if (!this.isAnnotated && wire < this.lineOfOutput.length) this.lineOfOutput[wire] = line;
    });
    this.gates.push(...this.xors);
    const { gates, lineOfOutput, lineOfBit, read } = this;
    return { gates, lineOfOutput, lineOfBit, read };
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
