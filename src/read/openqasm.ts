/**
 * Reads OpenQASM 2.0 and 3 (3.0, 3.1): text to circuit, with every mistake of the text reported, one message
 * each, or a warning for what is allowed but doubtful.
 *
 * Understood: the gates of the standard headers, U, gphase, gate definitions, modifiers, registers, ranges,
 * sets, aliases, broadcasting, typed constants, for over constant ranges, if and else on bits, measure, reset,
 * barrier, assignments of bits, annotations. Refused by name: everything else (see openqasm-parser.ts).
 * Limits: 20 million characters, 10,000 wires, 100,000 bits, 500,000 operations when written out, blocks 64 deep, expressions 200
 * deep, definitions that call each other 200 deep, loops of 1,000,000 rounds, powers up to 1e6.
 * `negctrl(n) @` is read as n nested `negctrl @`: all controls on 0. Integers divide without truncation in the
 * exponent of `pow` (the standard's own library writes `pow(1/2)`), and with truncation elsewhere.
 * Sources: Cross, Bishop, Smolin, Gambetta, arXiv:1707.03429; ACM Trans. Quantum Comput. 3, 12 (2022).
 */
import type { Circuit } from '../circuit/circuit.ts';
import { InputError, type InputProblem } from '../input-error.ts';
import { execute } from './openqasm-expand.ts';
import type { Reader } from './openqasm-names.ts';
import { parserOf } from './openqasm-parser.ts';
import { Abandoned, allProblems, Halted, problemsOf, report, warn } from './openqasm-problems.ts';
import { scannerOf } from './openqasm-scanner.ts';
import { nextStatement } from './openqasm-statements.ts';

/** Longest text that is read, in UTF-16 code units. */
const TEXT_MAX = 20_000_000;

/**
 * The circuit of an OpenQASM text; `name` is its file name, for messages. Throws one InputError with all
 * mistakes of the text, in its order.
 */
export function readCircuit(
  text: string,
  name: string,
): { circuit: Circuit; warnings: InputProblem[] } {
  if (text.length > TEXT_MAX) {
    const message = `a text of ${text.length} characters: ${TEXT_MAX} is the limit here`;
    throw new InputError({ code: 'too-large', message, file: name });
  }
  const problems = problemsOf(text, name);
  let reader: Reader | undefined;
  try {
    reader = readerOf(problems);
    readAll(reader);
  } catch (error) {
    // both were reported when they were thrown
    if (!(error instanceof Abandoned || error instanceof Halted)) throw error;
  }
  if (problems.errors.length > 0 || !reader) throw new InputError(allProblems(problems));
  const { wires, bits, qubitRegisters, bitRegisters, operations, globalPhase } = reader;
  const language = reader.parser.dialect;
  const circuit: Circuit = {
    name,
    wires,
    bits,
    qubitRegisters,
    bitRegisters,
    operations,
    globalPhase: globalPhase === 0 ? 0 : globalPhase,
    language,
  };
  return { circuit, warnings: problems.warnings };
}

function readerOf(problems: Reader['problems']): Reader {
  return {
    problems,
    parser: parserOf(scannerOf(problems)),
    wires: 0,
    bits: 0,
    qubitRegisters: [],
    bitRegisters: [],
    operations: [],
    globalPhase: 0,
    scopes: [new Map()],
    gates: new Map(),
    opaque: new Set(),
    fromHeader: new Set(),
    included: false,
    work: 0,
    made: 0,
    heldBits: 0,
    realDivision: false,
    hasVersion: false,
  };
}

function readAll(r: Reader): void {
  let isFirst = true;
  for (;;) {
    const statement = nextStatement(r.parser);
    if (statement === undefined) break;
    if (isFirst && statement?.kind !== 'version') {
      const message = 'no version line: read as OpenQASM 3';
      warn(r.problems, 0, 'no-version', message);
    }
    if (statement?.kind === 'version' && !isFirst) r.hasVersion = true;
    isFirst = false;
    if (statement) execute(r, statement);
  }
  if (r.wires === 0 && r.problems.errors.length === 0) {
    const message = isFirst
      ? 'expected OpenQASM, got an empty text'
      : 'missing qubits: none is declared';
    report(r.problems, r.parser.scanner.previousEnd, 'no-qubits', message);
  }
}
