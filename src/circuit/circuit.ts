/**
 * The circuit: plain data, in the order of the text.
 *
 * Wires are numbered 0 .. wires-1 and wire 0 is the most significant bit of a basis state's index; bits
 * are numbered 0 .. bits-1, and bit 0 of a register is its least significant one, as in OpenQASM.
 * Operations never share mutable state: a rewriting makes new ones.
 */

export type Register = {
  name: string;
  /** Number of its first wire or bit. */
  first: number;
  size: number;
  /** Declared without a size (`qubit a;`), so that it is written without an index. */
  scalar: boolean;
  /** Bits that only keep a value for a later condition: no outputs of the program. */
  hidden?: true;
};

/** A boolean expression over classical bits: the condition of an operation, or a value assigned. */
export type BitExpression =
  | { kind: 'constant'; value: boolean }
  | { kind: 'bit'; bit: number }
  | { kind: 'not'; of: BitExpression }
  | { kind: 'and' | 'or' | 'xor'; of: readonly BitExpression[] };

type Common = {
  /** The operation happens only when this holds; it is evaluated when the operation is reached. */
  condition?: BitExpression;
  /** Annotation lines that stand before the statement, without the `@`: `wiregauge.enters 3`. */
  annotations?: readonly string[];
  /** Position of the statement in the text, 1-based. */
  line?: number;
  column?: number;
};

/**
 * A unitary: `base^power` on the last wires, controlled by the first `controls.length` wires.
 * `name` is a key of the gate table, or `unitary` with an explicit `matrix` of its own.
 */
export type GateOperation = Common & {
  kind: 'gate';
  name: string;
  /** In radians, as many as the table's entry takes. */
  angles: readonly number[];
  /** Control wires first, then the base gate's own operands; all different. */
  wires: readonly number[];
  /** Extra controls by `ctrl @` (true) and `negctrl @` (false), outermost first. Usually empty. */
  controls: readonly boolean[];
  /** Principal power of the base gate's matrix, eigenphases in (-pi, pi]. Usually 1. */
  power: number;
  /** For `unitary` only: planar 2^k x 2^k, k = wires.length - controls.length. */
  matrix?: Float64Array;
  /** For `unitary` only: the name to show and to write (`gate NAME ...`). */
  label?: string;
  /** For `unitary` only: how the matrix is made of other gates, where that is known, so that it can be written. */
  definition?: GateBody;
};

/** Gates on wires 0 .. k-1 and a factor e^{i phase}: the body of a gate definition. */
export type GateBody = { operations: readonly GateOperation[]; phase: number };

export type MeasureOperation = Common & {
  kind: 'measure';
  wire: number;
  /** -1 when the outcome is thrown away. */
  bit: number;
};
export type ResetOperation = Common & { kind: 'reset'; wire: number };
export type BarrierOperation = Common & { kind: 'barrier'; wires: readonly number[] };
/** `bit = value`: a purely classical statement. */
export type AssignOperation = Common & { kind: 'assign'; bit: number; value: BitExpression };

export type Operation =
  | GateOperation
  | MeasureOperation
  | ResetOperation
  | BarrierOperation
  | AssignOperation;

export type Circuit = {
  /** File name or expression it came from; for messages and reports. */
  name: string;
  wires: number;
  bits: number;
  qubitRegisters: readonly Register[];
  bitRegisters: readonly Register[];
  operations: readonly Operation[];
  /** Angle of a global factor e^{i globalPhase}, from `gphase` at top level. */
  globalPhase: number;
  /** The language it was read from, when it was. */
  language?: '2.0' | '3';
};

/** An empty circuit with registers `q` and, if there are bits, `c`. */
export function emptyCircuit(wires: number, bits = 0, name = 'circuit'): Circuit {
  const bitRegisters = bits > 0 ? [{ name: 'c', first: 0, size: bits, scalar: false }] : [];
  return {
    name,
    wires,
    bits,
    qubitRegisters: wires > 0 ? [{ name: 'q', first: 0, size: wires, scalar: false }] : [],
    bitRegisters,
    operations: [],
    globalPhase: 0,
  };
}

/** A gate of the table on the given wires. */
export function gate(name: string, wires: readonly number[], ...angles: number[]): GateOperation {
  return { kind: 'gate', name, angles, wires, controls: [], power: 1 };
}

/** A unitary given by its matrix (planar, 2^wires x 2^wires). */
export function unitaryGate(
  matrix: Float64Array,
  wires: readonly number[],
  label = 'unitary',
): GateOperation {
  return {
    kind: 'gate',
    name: 'unitary',
    angles: [],
    wires,
    controls: [],
    power: 1,
    matrix,
    label,
  };
}

/** A unitary as a circuit of one gate without structure of its own. */
export function circuitOfUnitary(matrix: Float64Array, wires: number, name: string): Circuit {
  const all = Array.from({ length: wires }, (_, k) => k);
  return { ...emptyCircuit(wires, 0, name), operations: [unitaryGate(matrix, all)] };
}

/** The bits that are outputs of the program: all but those of hidden registers, ascending. */
export function visibleBits(circuit: Circuit): number[] {
  const isHidden = new Uint8Array(circuit.bits);
  for (const { first, size, hidden } of circuit.bitRegisters) {
    if (hidden) isHidden.fill(1, first, first + size);
  }
  return Array.from({ length: circuit.bits }, (_, bit) => bit).filter((bit) => !isHidden[bit]);
}

/** `q[2]`, or the register's bare name where it is scalar. */
export function wireName(circuit: Circuit, wire: number): string {
  return nameIn(circuit.qubitRegisters, wire);
}

/** `c[2]`, or the register's bare name where it is scalar. */
export function bitName(circuit: Circuit, bit: number): string {
  return nameIn(circuit.bitRegisters, bit);
}

function nameIn(registers: readonly Register[], index: number): string {
  for (const { name, first, size, scalar } of registers) {
    if (index >= first && index < first + size) return scalar ? name : `${name}[${index - first}]`;
  }
  return `#${index}`;
}

/** The wires an operation acts on, in its own order; none for a classical assignment. */
export function operationWires(operation: Operation): readonly number[] {
  switch (operation.kind) {
    case 'gate':
    case 'barrier':
      return operation.wires;
    case 'measure':
    case 'reset':
      return [operation.wire];
    case 'assign':
      return [];
  }
}

/** The same operation with every wire put elsewhere. */
export function moved(operation: Operation, place: (wire: number) => number): Operation {
  switch (operation.kind) {
    case 'gate':
    case 'barrier':
      return { ...operation, wires: operation.wires.map(place) };
    case 'measure':
    case 'reset':
      return { ...operation, wire: place(operation.wire) };
    case 'assign':
      return operation;
  }
}

/** Gates on wires 0 .. k-1 as gates on the wires given. */
export function onWires(
  operations: readonly GateOperation[],
  wires: readonly number[],
): GateOperation[] {
  return operations.map((operation) => ({
    ...operation,
    wires: operation.wires.map((wire) => wires[wire]!),
  }));
}

/** The bits a boolean expression reads, each once, ascending. */
export function bitsOf(expression: BitExpression | undefined): number[] {
  const found = new Set<number>();
  const visit = (part: BitExpression): void => {
    if (part.kind === 'bit') found.add(part.bit);
    else if (part.kind === 'not') visit(part.of);
    else if (part.kind !== 'constant') part.of.forEach(visit);
  };
  if (expression) visit(expression);
  return [...found].sort((a, b) => a - b);
}

/** The bits an operation reads (its condition, and the value of an assignment). */
export function bitsRead(operation: Operation): number[] {
  const read = bitsOf(operation.condition);
  if (operation.kind !== 'assign') return read;
  return [...new Set([...read, ...bitsOf(operation.value)])].sort((a, b) => a - b);
}

/** The bit an operation writes, or -1. */
export function bitWritten(operation: Operation): number {
  return operation.kind === 'measure' || operation.kind === 'assign' ? operation.bit : -1;
}

/** The value of a boolean expression, given the value of each bit. */
export function evaluateBits(
  expression: BitExpression,
  bitValue: (bit: number) => boolean,
): boolean {
  switch (expression.kind) {
    case 'constant':
      return expression.value;
    case 'bit':
      return bitValue(expression.bit);
    case 'not':
      return !evaluateBits(expression.of, bitValue);
    case 'and':
      return expression.of.every((part) => evaluateBits(part, bitValue));
    case 'or':
      return expression.of.some((part) => evaluateBits(part, bitValue));
    case 'xor':
      return expression.of.reduce((sum, part) => sum !== evaluateBits(part, bitValue), false);
  }
}
