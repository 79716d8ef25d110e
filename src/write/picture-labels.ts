/**
 * The words of a picture: how a gate, an angle or a condition is written in textbook notation, and how an
 * operation is said in one line of plain text.
 */
import {
  type BitExpression,
  bitName,
  type Circuit,
  type GateOperation,
  type Operation,
  wireName,
} from '../circuit/circuit.ts';

/** A gate's symbol in parts, so that each can be set in its own size. */
export type Symbol = { base: string; lower?: string; upper?: string; angle?: string };

/** A multiple of pi where it is one with a small denominator, else three significant digits. */
export function angleText(angle: number): string {
  if (Math.abs(angle) < 1e-12) return '0';
  const turns = angle / Math.PI;
  for (const denominator of [1, 2, 3, 4, 6, 8, 12, 16, 32, 64, 128, 256]) {
    const numerator = turns * denominator;
    const whole = Math.round(numerator);
    if (whole === 0 || Math.abs(numerator - whole) > 1e-9 || Math.abs(whole) > 99) continue;
    const sign = whole < 0 ? '−' : '';
    const times = Math.abs(whole) === 1 ? '' : `${Math.abs(whole)}`;
    return `${sign}${times}π${denominator === 1 ? '' : `/${denominator}`}`;
  }
  return angle.toPrecision(3).replace('-', '−').replace('e−', 'e-');
}

/** The base gate behind a controlled one: `controls` of its wires are dots and the rest carries `name`. */
export type DrawnGate = {
  controls: number;
  name: string;
  angles: readonly number[];
};

const controlledGates: Readonly<Record<string, readonly [number, string]>> = {
  cx: [1, 'x'],
  CX: [1, 'x'],
  cy: [1, 'y'],
  cz: [1, 'z'],
  ch: [1, 'h'],
  csx: [1, 'sx'],
  csxdg: [1, 'sxdg'],
  cp: [1, 'p'],
  cphase: [1, 'p'],
  cu1: [1, 'p'],
  crx: [1, 'rx'],
  cry: [1, 'ry'],
  crz: [1, 'rz'],
  cu: [1, 'u'],
  cu3: [1, 'u3'],
  ccx: [2, 'x'],
  ccz: [2, 'z'],
  cswap: [1, 'swap'],
  c3x: [3, 'x'],
  c4x: [4, 'x'],
  c3sqrtx: [3, 'sx'],
  c3sqrtxdg: [3, 'sxdg'],
};

/** Splits a gate of the table into its own controls and what they control. */
export function drawnGate(gate: GateOperation): DrawnGate {
  const known = Object.hasOwn(controlledGates, gate.name) ? controlledGates[gate.name] : undefined;
  // a power of a controlled gate is drawn as a box: dots would claim a power of the base alone
  if (!known || gate.power !== 1) return { controls: 0, name: gate.name, angles: gate.angles };
  return { controls: known[0], name: known[1], angles: gate.angles };
}

const symbols: Readonly<Record<string, Symbol>> = {
  id: { base: 'I' },
  sdg: { base: 'S', upper: '†' },
  tdg: { base: 'T', upper: '†' },
  sx: { base: '√X' },
  sxdg: { base: '√X', upper: '†' },
  rx: { base: 'R', lower: 'x' },
  ry: { base: 'R', lower: 'y' },
  rz: { base: 'R', lower: 'z' },
  rxx: { base: 'R', lower: 'xx' },
  ryy: { base: 'R', lower: 'yy' },
  rzz: { base: 'R', lower: 'zz' },
  phase: { base: 'P' },
  u1: { base: 'U', lower: '1' },
  u2: { base: 'U', lower: '2' },
  u3: { base: 'U', lower: '3' },
  prx: { base: 'R', lower: 'xy' },
  iswap: { base: 'iSWAP' },
  iswapdg: { base: 'iSWAP', upper: '†' },
  sqrtiswap: { base: '√iSWAP' },
  sqrtiswapdg: { base: '√iSWAP', upper: '†' },
  csx: { base: 'C√X' },
  bdg: { base: 'B', upper: '†' },
  unitary: { base: 'U' },
};

/** The symbol of a gate, with its angles and its power. */
export function gateSymbol(gate: GateOperation, drawn: DrawnGate = drawnGate(gate)): Symbol {
  const named = Object.hasOwn(symbols, drawn.name) ? symbols[drawn.name] : undefined;
  const symbol: Symbol =
    drawn.name === 'unitary' && gate.label
      ? { base: shorten(gate.label) }
      : { ...(named ?? { base: drawn.name.length <= 2 ? drawn.name.toUpperCase() : drawn.name }) };
  if (gate.power !== 1) symbol.upper = `${symbol.upper ?? ''}${gate.power}`;
  if (drawn.angles.length > 0) symbol.angle = drawn.angles.map(angleText).join(', ');
  return symbol;
}

function shorten(label: string): string {
  return label.length <= 10 ? label : `${label.slice(0, 9)}…`;
}

/** A condition as it is read aloud: `c[0] and not c[1]`. */
export function conditionText(circuit: Circuit, condition: BitExpression): string {
  const write = (part: BitExpression, nested: boolean): string => {
    switch (part.kind) {
      case 'constant':
        return part.value ? '1' : '0';
      case 'bit':
        return bitName(circuit, part.bit);
      case 'not':
        return `not ${write(part.of, true)}`;
      default: {
        const text = part.of.map((inner) => write(inner, true)).join(` ${part.kind} `);
        return nested ? `(${text})` : text;
      }
    }
  };
  return write(condition, false);
}

/** One line of plain text for an operation: `cx q[0], q[3] if c[1]`. */
export function operationText(circuit: Circuit, operation: Operation): string {
  const when = operation.condition ? ` if ${conditionText(circuit, operation.condition)}` : '';
  switch (operation.kind) {
    case 'gate': {
      const controls = operation.controls.map((on) =>
        on ? 'controlled ' : 'negatively controlled ',
      );
      const power = operation.power === 1 ? '' : ` to the power ${operation.power}`;
      const name = operation.name === 'unitary' ? (operation.label ?? 'unitary') : operation.name;
      const angles = operation.angles.length
        ? `(${operation.angles.map(angleText).join(', ')})`
        : '';
      const wires = operation.wires.map((wire) => wireName(circuit, wire)).join(', ');
      return `${controls.join('')}${name}${angles}${power} ${wires}${when}`;
    }
    case 'measure': {
      const into = operation.bit < 0 ? '' : ` into ${bitName(circuit, operation.bit)}`;
      return `measure ${wireName(circuit, operation.wire)}${into}${when}`;
    }
    case 'reset':
      return `reset ${wireName(circuit, operation.wire)}${when}`;
    case 'barrier':
      return 'barrier';
    case 'assign':
      return `${bitName(circuit, operation.bit)} = ${conditionText(circuit, operation.value)}${when}`;
  }
}
