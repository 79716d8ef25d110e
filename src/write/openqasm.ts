/**
 * Writes a circuit as OpenQASM 3 (`stdgates.inc`, with `gate` definitions for what it lacks), or 2.0 where
 * that can say the same. What is written reads back to the same circuit.
 *
 * A gate given by its matrix needs a body: on one wire it is found here (U and gphase), otherwise it comes
 * with the operation (`definition`) or from `options.definitions` by its label.
 */
import {
  type BitExpression,
  bitName,
  bitsOf,
  bitWritten,
  type Circuit,
  type GateBody,
  type GateOperation,
  type Operation,
  wireName,
} from '../circuit/circuit.ts';
import { InputError } from '../input-error.ts';
import { conditionText, registerComparison, sameCondition } from './condition-text.ts';
import { type Definitions, definitionsOf } from './gate-names.ts';
import { angleText, decimalText } from './numbers.ts';
import { safelyNamed } from './register-names.ts';

export type WriteOptions = {
  language?: '2.0' | '3';
  /** Lines above the text, without `//`. */
  comments?: readonly string[];
  /** Bodies for gates given by their matrix, by label. `angles` is unused in a body: its numbers are fixed. */
  definitions?: ReadonlyMap<string, { body: readonly GateOperation[]; phase?: number }>;
};

export function writeCircuit(circuit: Circuit, options: WriteOptions = {}): string {
  const { language = '3', comments = [] } = options;
  const named = safelyNamed(circuit, language);
  const bodies = new Map<string, GateBody>();
  for (const [label, { body, phase = 0 }] of options.definitions ?? []) {
    bodies.set(label, { operations: body, phase });
  }
  const definitions = definitionsOf(named, language, bodies, gateText);
  const lines = comments.flatMap((c) => c.split(/\r?\n/)).map((c) => (c === '' ? '//' : `// ${c}`));
  if (language === '3') lines.push('OPENQASM 3.0;', 'include "stdgates.inc";');
  else lines.push('OPENQASM 2.0;', 'include "qelib1.inc";');
  lines.push('', ...definitions.lines, ...(definitions.lines.length > 0 ? [''] : []));
  lines.push(...declarations(named, language), '');
  if (language === '3' && named.globalPhase !== 0) {
    lines.push(`gphase(${angleText(named.globalPhase)});`);
  }
  if (language === '3') writeOperations(named, definitions, lines);
  else for (const operation of named.operations) writeOld(named, definitions, operation, lines);
  while (lines[lines.length - 1] === '') lines.pop();
  return `${lines.join('\n')}\n`;
}

function declarations(circuit: Circuit, language: '2.0' | '3'): string[] {
  const lines: string[] = [];
  for (const [registers, word, oldWord] of [
    [circuit.qubitRegisters, 'qubit', 'qreg'],
    [circuit.bitRegisters, 'bit', 'creg'],
  ] as const) {
    for (const { name, size, scalar, hidden } of registers) {
      if (hidden) lines.push(`${language === '3' ? '' : '// '}@wiregauge.hidden`);
      if (language === '2.0') lines.push(`${oldWord} ${name}[${size}];`);
      else lines.push(scalar ? `${word} ${name};` : `${word}[${size}] ${name};`);
    }
  }
  return lines;
}

/** `ctrl @ pow(0.5) @ rx(pi/4) q[0], q[1];` with the given names of operands. */
function gateText(
  definitions: Definitions,
  operation: GateOperation,
  operands: readonly string[],
  language: '2.0' | '3',
): string {
  const { angles, controls, power } = operation;
  let modifiers = '';
  for (let k = 0; k < controls.length; ) {
    let end = k + 1;
    // negctrl(n) is not written: its formula in the standard can be read in two ways
    while (controls[k] && end < controls.length && controls[end]) end++;
    const count = end - k;
    modifiers += controls[k] ? (count > 1 ? `ctrl(${count}) @ ` : 'ctrl @ ') : 'negctrl @ ';
    k = end;
  }
  if (power !== 1) modifiers += `pow(${decimalText(power)}) @ `;
  if (modifiers !== '' && language === '2.0') {
    refuse(operation, `the modifiers ${modifiers.trim()}`);
  }
  for (const angle of [...angles, power]) {
    if (!Number.isFinite(angle)) {
      const message = `expected finite angles, got ${angle} in gate ${operation.name}`;
      throw new InputError({ code: 'not-finite', message });
    }
  }
  const list = angles
    .map((angle) => angleText(angle, language))
    .join(language === '3' ? ', ' : ',');
  const call = definitions.nameOf(operation) + (angles.length > 0 ? `(${list})` : '');
  return `${modifiers}${call} ${operands.join(language === '3' ? ', ' : ',')};`;
}

/** The statement of an operation, without its condition and annotations. */
function statementText(circuit: Circuit, definitions: Definitions, operation: Operation): string {
  switch (operation.kind) {
    case 'gate': {
      const operands = operation.wires.map((wire) => wireName(circuit, wire));
      return gateText(definitions, operation, operands, '3');
    }
    case 'measure': {
      const measure = `measure ${wireName(circuit, operation.wire)};`;
      return operation.bit < 0 ? measure : `${bitName(circuit, operation.bit)} = ${measure}`;
    }
    case 'reset':
      return `reset ${wireName(circuit, operation.wire)};`;
    case 'barrier':
      return `barrier ${barrierOperands(circuit, operation.wires).join(', ')};`;
    case 'assign': {
      const { value } = operation;
      const text =
        value.kind === 'constant' ? String(Number(value.value)) : conditionText(circuit, value);
      return `${bitName(circuit, operation.bit)} = ${text};`;
    }
  }
}

/** Names of wires, with whole registers by their bare names. */
function barrierOperands(circuit: Circuit, wires: readonly number[]): string[] {
  const names: string[] = [];
  for (let k = 0; k < wires.length; ) {
    const register = circuit.qubitRegisters.find(({ first }) => first === wires[k]);
    const size = register?.size ?? 0;
    const isWhole = register && wires.slice(k, k + size).every((w, i) => w === register.first + i);
    if (isWhole && k + size <= wires.length) {
      names.push(register.name);
      k += size;
    } else names.push(wireName(circuit, wires[k++]!));
  }
  return names;
}

/** OpenQASM 3: neighbours under one condition share one `if`. */
function writeOperations(circuit: Circuit, definitions: Definitions, lines: string[]): void {
  const { operations } = circuit;
  for (let k = 0; k < operations.length; ) {
    const { condition } = operations[k]!;
    const end = groupEnd(operations, k);
    if (condition?.kind === 'constant' && !condition.value) {
      k = end;
      continue;
    }
    const isOpen = condition !== undefined && condition.kind !== 'constant';
    if (isOpen) lines.push(`if (${conditionText(circuit, condition)}) {`);
    const indent = isOpen ? '  ' : '';
    for (; k < end; k++) {
      const operation = operations[k]!;
      for (const note of operation.annotations ?? []) lines.push(`${indent}@${oneLine(note)}`);
      lines.push(indent + statementText(circuit, definitions, operation));
    }
    if (isOpen) lines.push('}');
  }
}

/** One past the last operation that shares the condition of operation `first`, none changing it in between. */
function groupEnd(operations: readonly Operation[], first: number): number {
  const { condition } = operations[first]!;
  if (!condition) return first + 1;
  const read = new Set(bitsOf(condition));
  let end = first + 1;
  while (end < operations.length) {
    if (read.has(bitWritten(operations[end - 1]!))) break;
    if (!sameCondition(condition, operations[end]!.condition)) break;
    end++;
  }
  return end;
}

const oneLine = (text: string): string => text.replaceAll(/\s*[\r\n]+\s*/g, ' ').trim();

/** OpenQASM 2.0: what it cannot say is an error. */
function writeOld(
  circuit: Circuit,
  definitions: Definitions,
  operation: Operation,
  lines: string[],
): void {
  for (const note of operation.annotations ?? []) lines.push(`// @${oneLine(note)}`);
  const condition = operation.condition
    ? oldCondition(circuit, operation, operation.condition)
    : '';
  if (condition === null) return;
  switch (operation.kind) {
    case 'gate': {
      const operands = operation.wires.map((wire) => wireName(circuit, wire));
      lines.push(condition + gateText(definitions, operation, operands, '2.0'));
      break;
    }
    case 'measure':
      if (operation.bit < 0) refuse(operation, 'a measurement without a bit');
      lines.push(
        `${condition}measure ${wireName(circuit, operation.wire)} -> ${bitName(circuit, operation.bit)};`,
      );
      break;
    case 'reset':
      lines.push(`${condition}reset ${wireName(circuit, operation.wire)};`);
      break;
    case 'barrier':
      lines.push(`barrier ${barrierOperands(circuit, operation.wires).join(',')};`);
      break;
    case 'assign':
      refuse(operation, 'an assignment of a bit');
  }
}

/** `if(c==3) `, or nothing for a condition that always holds, or null for one that never does. */
function oldCondition(
  circuit: Circuit,
  operation: Operation,
  condition: BitExpression,
): string | null {
  if (condition.kind === 'constant') return condition.value ? '' : null;
  const whole = registerComparison(circuit, condition);
  if (whole?.equal) return `if(${whole.register.name}==${whole.value}) `;
  const bit = condition.kind === 'not' ? condition.of : condition;
  const register = circuit.bitRegisters.find((r) => bit.kind === 'bit' && r.first === bit.bit);
  if (register?.size === 1) return `if(${register.name}==${condition.kind === 'not' ? 0 : 1}) `;
  return refuse(operation, `the condition (${conditionText(circuit, condition)})`);
}

function refuse({ line, column }: Operation, what: string): never {
  const message = `OpenQASM 2.0 cannot say ${what}`;
  throw new InputError({
    code: 'not-in-2.0',
    message,
    ...(line === undefined ? {} : { line }),
    ...(column === undefined ? {} : { column }),
    hint: 'write OpenQASM 3 instead',
  });
}
