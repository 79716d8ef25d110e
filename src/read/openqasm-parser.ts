/** What the parser knows while it reads, and the words of the language that it refuses or begins statements with. */
import type { Dialect } from './openqasm-expressions.ts';
import type { Scanner } from './openqasm-scanner.ts';

export type Parser = {
  scanner: Scanner;
  dialect: Dialect;
  /** Names whose declaration was wrong or refused. */
  spoilt: Set<string>;
  /** Names of the gates that the text defines. */
  gates: Set<string>;
  /** Blocks open now. */
  blocks: number;
  inGate: boolean;
};

export function parserOf(scanner: Scanner): Parser {
  return { scanner, dialect: '3', spoilt: new Set(), gates: new Set(), blocks: 0, inGate: false };
}

/** Why a keyword of the language is refused, as the end of a sentence. */
export const REFUSED = new Map<string, string>([
  ['def', 'subroutines (def) are not supported'],
  ['extern', 'external functions (extern) are not supported'],
  ['defcal', 'pulse definitions (defcal) are not supported'],
  ['defcalgrammar', 'pulse grammars (defcalgrammar) are not supported'],
  ['cal', 'pulse blocks (cal) are not supported'],
  ['while', 'while loops are not supported: their length is not known before the run'],
  ['switch', 'switch is not supported; use if'],
  ['break', 'break is not supported'],
  ['continue', 'continue is not supported'],
  ['return', 'return is not supported'],
  ['end', 'end is not supported'],
  ['delay', 'delay is not supported: timing belongs to the device'],
  ['box', 'box is not supported: timing belongs to the device'],
  ['nop', 'nop is not supported'],
  ['duration', 'durations are not supported: timing belongs to the device'],
  ['stretch', 'stretches are not supported: timing belongs to the device'],
  ['array', 'arrays are not supported'],
  ['input', 'input parameters are not supported; write the value as a const'],
  ['output', 'output declarations are not supported; every bit is an output'],
  ['complex', 'variables of type complex are not supported'],
  ['int', 'variables of type int are not supported; use const int'],
  ['uint', 'variables of type uint are not supported; use const uint'],
  ['float', 'variables of type float are not supported; use const float'],
  ['angle', 'variables of type angle are not supported; use const angle'],
  ['bool', 'variables of type bool are not supported; use bit or const bool'],
]);
export const CONSTANT_TYPES = new Set(['int', 'uint', 'float', 'angle', 'bool']);
export const DECLARING =
  /^(?:qubit|bit|qreg|creg|const|let|gate|opaque|def|extern|input|output|int|uint|float|angle|bool|complex|array|duration|stretch)\b/;
export const NEVER_IN_GATE = new Set([
  'OPENQASM',
  'include',
  'qubit',
  'qreg',
  'bit',
  'creg',
  'gate',
  'opaque',
]);
export const ONLY_3 = new Set(
  'qubit bit const let for ctrl negctrl inv pow gphase pragma else'.split(' '),
);
export const STARTERS = new Set([
  ...REFUSED.keys(),
  ...NEVER_IN_GATE,
  ...[
    'const',
    'let',
    'measure',
    'reset',
    'barrier',
    'if',
    'for',
    'pragma',
    'ctrl',
    'negctrl',
    'inv',
  ],
]);
