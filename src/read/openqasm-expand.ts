/**
 * Executes the statements of a text: declarations, gates, measurements, loops and conditions, written out as
 * the operations of a circuit.
 *
 * `if` and `else` become the `condition` of every operation in them. A body that overwrites a bit its own
 * condition reads would change its mind half-way; then the condition's value is kept in a hidden bit first.
 */
import { type BitExpression, bitsOf, bitWritten, type Operation } from '../circuit/circuit.ts';
import { bitsOfWidth, convert, truth } from './openqasm-arithmetic.ts';
import { allOf, anyOf, negated, oddOf } from './openqasm-conditions.ts';
import { defineGate } from './openqasm-definitions.ts';
import { executeCall, integerMeaning } from './openqasm-gates.ts';
import {
  addBits,
  BITS_MAX,
  declare,
  emit,
  holdBit,
  lookUp,
  type Reader,
  spend,
  type Value,
  WIRES_MAX,
} from './openqasm-names.ts';
import { parserOf } from './openqasm-parser.ts';
import { Abandoned, fail, placeOf, warn } from './openqasm-problems.ts';
import { scannerOf } from './openqasm-scanner.ts';
import { nextStatement } from './openqasm-statements.ts';
import type { Operand, Statement } from './openqasm-tree.ts';
import { evaluate, loopValues, resolve, sizeOf } from './openqasm-values.ts';

type Of<K extends Statement['kind']> = Extract<Statement, { kind: K }>;

/** Executes one statement; its mistakes are reported and end that statement only. */
export function execute(r: Reader, statement: Statement): void {
  const first = r.operations.length;
  spend(r, statement.at, 1);
  try {
    run(r, statement);
  } catch (error) {
    if (!(error instanceof Abandoned)) throw error;
    // a mistake costs more time than a statement
    spend(r, statement.at, 9);
    spoilDeclared(r, statement);
  }
  if (r.operations.length === first) return;
  const { line, column } = placeOf(r.problems, statement.at);
  for (let k = first; k < r.operations.length; k++) {
    const operation = r.operations[k]!;
    // statements inside this one have marked theirs already
    if (operation.line === undefined) Object.assign(operation, { line, column });
  }
  if (statement.annotations) {
    const operation = r.operations[first]!;
    const annotations = [...statement.annotations, ...(operation.annotations ?? [])];
    Object.assign(operation, { annotations });
  }
}

/** What a failed declaration would have declared is not missed again later. */
function spoilDeclared(r: Reader, statement: Statement): void {
  switch (statement.kind) {
    case 'qubits':
    case 'bits':
    case 'constant':
    case 'alias':
    case 'gate':
      if (!lookUp(r, statement.name.name)) r.parser.spoilt.add(statement.name.name);
  }
}

function run(r: Reader, statement: Statement): void {
  switch (statement.kind) {
    case 'version':
      runVersion(r, statement);
      break;
    case 'include':
      runInclude(r, statement);
      break;
    case 'pragma':
      warn(r.problems, statement.at, 'pragma', `pragma ignored: ${statement.text.slice(0, 80)}`);
      break;
    case 'qubits':
    case 'bits':
    case 'constant':
    case 'alias':
    case 'gate':
      runDeclaration(r, statement);
      break;
    case 'opaque': {
      // refused only when it is used, as a gate without a body
      r.parser.spoilt.delete(statement.name.name);
      r.opaque.add(statement.name.name);
      break;
    }
    case 'call':
      if (r.opaque.has(statement.name.name)) {
        const message = `gate ${statement.name.name} is opaque: it has no definition`;
        fail(r.problems, statement.name.at, 'not-supported', message);
      }
      executeCall(r, statement);
      break;
    case 'measure':
      runMeasure(r, statement.at, statement.operand, statement.target);
      break;
    case 'reset': {
      const { places } = resolve(r, statement.operand, 'qubits');
      spend(r, statement.at, places.length);
      for (const wire of places) emit(r, statement.at, { kind: 'reset', wire });
      break;
    }
    case 'barrier':
      runBarrier(r, statement);
      break;
    case 'assign':
      runAssign(r, statement);
      break;
    case 'if':
      runIf(r, statement);
      break;
    case 'for':
      runFor(r, statement);
      break;
  }
}

function runVersion(r: Reader, statement: Of<'version'>): void {
  const isLate = r.hasVersion || r.operations.length > 0 || r.wires > 0 || r.bits > 0;
  if (isLate) {
    fail(
      r.problems,
      statement.at,
      'version',
      'the version must be the first statement, and only once',
    );
  }
  r.hasVersion = true;
}

function runInclude(r: Reader, { at, file }: Of<'include'>): void {
  const expectedFile = r.parser.dialect === '3' ? 'stdgates.inc' : 'qelib1.inc';
  if (file !== expectedFile) {
    const message = `including ${file.slice(0, 80)} is not supported`;
    fail(r.problems, at, 'not-supported', message, `only "${expectedFile}" is known here`);
  }
  if (r.parser.dialect === '3') {
    for (const [name, gate] of r.gates) {
      if (gate.definition.at < at && STANDARD_3.has(name)) {
        fail(
          r.problems,
          at,
          'already-declared',
          `gate ${name} is defined before the include that defines it`,
        );
      }
    }
  }
  r.included = true;
  if (r.parser.dialect === '2.0') includeRest(r);
}

const STANDARD_3 = new Set(
  'p x y z h s sdg t tdg sx rx ry rz cx cy cz cp crx cry crz ch swap ccx cswap cu CX phase cphase id u1 u2 u3'.split(
    ' ',
  ),
);

/** Gates of later copies of the 2.0 header that the gate table lacks. */
const REST_OF_HEADER = `
gate u0(gamma) q { U(0,0,0) q; }
gate rc3x a,b,c,d {
  u2(0,pi) d; u1(pi/4) d; cx c,d; u1(-pi/4) d; u2(0,pi) d; cx a,d; u1(pi/4) d; cx b,d; u1(-pi/4) d;
  cx a,d; u1(pi/4) d; cx b,d; u1(-pi/4) d; u2(0,pi) d; u1(pi/4) d; cx c,d; u1(-pi/4) d; u2(0,pi) d;
}`;

function includeRest(r: Reader): void {
  const problems = { ...r.problems, text: REST_OF_HEADER };
  const parser = parserOf(scannerOf(problems));
  parser.dialect = '2.0';
  for (let next = nextStatement(parser); next; next = nextStatement(parser)) {
    if (next.kind === 'gate' && !r.gates.has(next.name.name)) {
      defineGate(r, next);
      r.fromHeader.add(next.name.name);
    }
  }
}

function runDeclaration(
  r: Reader,
  statement: Of<'qubits' | 'bits' | 'constant' | 'alias' | 'gate'>,
): void {
  if (statement.kind === 'constant') {
    const value = convert(r, statement.type, evaluate(r, statement.value), statement.value.at);
    if (value.kind === 'bits') {
      fail(
        r.problems,
        statement.value.at,
        'not-constant',
        'expected a constant, got bits that only the run knows',
      );
    }
    declare(r, statement.name, { kind: 'value', value });
    return;
  }
  if (r.scopes.length > 1) {
    const what =
      statement.kind === 'gate' ? 'gates' : statement.kind === 'alias' ? 'aliases' : 'registers';
    fail(r.problems, statement.at, 'not-allowed', `${what} must be declared outside of blocks`);
  }
  if (statement.kind === 'gate') {
    if (r.fromHeader.delete(statement.name.name)) r.gates.delete(statement.name.name);
    defineGate(r, statement);
    return;
  }
  if (statement.kind === 'alias') {
    runAlias(r, statement);
    return;
  }
  const { name } = statement;
  const isQubits = statement.kind === 'qubits';
  const taken = isQubits ? r.wires : r.bits;
  const [max, what] = isQubits ? [WIRES_MAX, 'qubits'] : [BITS_MAX, 'bits'];
  const size = statement.size ? sizeOf(r, statement.size, taken, max, what) : 1;
  const places = Array.from({ length: size }, (_, k) => taken + k);
  const scalar = statement.size === null;
  declare(r, name, { kind: isQubits ? 'qubits' : 'bits', places, scalar });
  if (isQubits) {
    r.qubitRegisters.push({ name: name.name, first: taken, size, scalar });
    r.wires += size;
    return;
  }
  const isHidden = statement.annotations?.includes(HIDDEN) ?? false;
  addBits(r, name.name, size, scalar, isHidden);
  if (statement.kind === 'bits' && statement.value) {
    const target: Operand = { at: name.at, name: name.name, indices: [] };
    runAssign(
      r,
      { kind: 'assign', at: statement.at, target, operator: '=', value: statement.value },
      true,
    );
  }
}

/** The annotation of registers that only keep values for later conditions. */
const HIDDEN = 'wiregauge.hidden';

function runAlias(r: Reader, { at, name, parts }: Of<'alias'>): void {
  const kind = lookUp(r, parts[0]!.name)?.kind === 'bits' ? 'bits' : 'qubits';
  const found = parts.map((part) => resolve(r, part, kind));
  const length = found.reduce((sum, { places }) => sum + places.length, 0);
  spend(r, at, length);
  const scalar = found.length === 1 && found[0]!.scalar;
  declare(r, name, { kind, places: found.flatMap(({ places }) => places), scalar });
}

function runMeasure(r: Reader, at: number, source: Operand, target: Operand | null): void {
  const { places: wires } = resolve(r, source, 'qubits');
  spend(r, at, wires.length);
  if (!target) {
    for (const wire of wires) emit(r, at, { kind: 'measure', wire, bit: -1 });
    return;
  }
  const { places: bits } = resolve(r, target, 'bits');
  if (wires.length !== bits.length) {
    const message = `expected ${wires.length} bit${wires.length === 1 ? '' : 's'} for the outcomes, got ${bits.length}`;
    fail(r.problems, target.at, 'size-mismatch', message);
  }
  if (new Set(bits).size < bits.length || new Set(wires).size < wires.length) {
    fail(r.problems, at, 'duplicate-operand', 'a measurement uses the same qubit or bit twice');
  }
  wires.forEach((wire, k) => {
    emit(r, at, { kind: 'measure', wire, bit: bits[k]! });
  });
}

function runBarrier(r: Reader, { at, operands }: Of<'barrier'>): void {
  const wires =
    operands.length === 0
      ? Array.from({ length: r.wires }, (_, k) => k)
      : [...new Set(operands.flatMap((operand) => resolve(r, operand, 'qubits').places))];
  spend(r, at, wires.length);
  if (wires.length > 0) emit(r, at, { kind: 'barrier', wires });
}

/** `c = ...;`, and the first value of a declaration (`isFresh`: what is 0 needs no statement). */
function runAssign(
  r: Reader,
  { at, target, operator, value }: Of<'assign'>,
  isFresh = false,
): void {
  if (value.kind === 'measure') {
    if (operator !== '=') {
      fail(
        r.problems,
        at,
        'not-supported',
        `a measurement must be assigned with =, got ${operator}`,
      );
    }
    runMeasure(r, at, value.operand, target);
    return;
  }
  const { places, scalar } = resolve(r, target, 'bits');
  if (new Set(places).size < places.length) {
    fail(r.problems, target.at, 'duplicate-operand', 'an assignment writes the same bit twice');
  }
  spend(r, at, places.length);
  const given = evaluate(r, value);
  let values = scalar
    ? [truthOfSingle(r, given, value.at)]
    : bitsOfWidth(r, given, places.length, value.at);
  if (operator !== '=') {
    const combine = operator === '&=' ? allOf : operator === '|=' ? anyOf : oddOf;
    values = values.map((part, k) => combine([{ kind: 'bit', bit: places[k]! }, part]));
  }
  const written = new Set<number>();
  const clashes = values.some((part, k) => {
    const reads = bitsOf(part).some((bit) => written.has(bit));
    written.add(places[k]!);
    return reads;
  });
  if (clashes) {
    values = values.map((part): BitExpression => {
      const bit = holdBit(r, at);
      emit(r, at, { kind: 'assign', bit, value: part });
      return { kind: 'bit', bit };
    });
  }
  values.forEach((part, k) => {
    if (isFresh && part.kind === 'constant' && !part.value) return;
    emit(r, at, { kind: 'assign', bit: places[k]!, value: part });
  });
}

function truthOfSingle(r: Reader, value: Value, at: number): BitExpression {
  if (value.kind === 'int' || value.kind === 'float') return bitsOfWidth(r, value, 1, at)[0]!;
  if (value.kind === 'bits' && value.bits.length !== 1) {
    const message = `expected 1 bit, got ${value.bits.length}`;
    fail(r.problems, at, 'size-mismatch', message);
  }
  return truth(r, value);
}

/** Runs statements in a scope of their own and returns what they emit; `isSure` when they happen in every run. */
function collect(r: Reader, body: readonly Statement[], isSure = false): Operation[] {
  const { operations, globalPhase } = r;
  r.operations = [];
  r.scopes.push(new Map());
  for (const statement of body) execute(r, statement);
  r.scopes.pop();
  const collected = r.operations;
  r.operations = operations;
  // a phase that depends on bits is never seen: they are known classically
  if (!isSure) r.globalPhase = globalPhase;
  return collected;
}

function runIf(r: Reader, { at, condition: node, then, otherwise }: Of<'if'>): void {
  let condition = truth(r, evaluate(r, node));
  if (condition.kind === 'constant') {
    const taken = collect(r, condition.value ? then : otherwise, true);
    // the other branch is read for its mistakes
    collect(r, condition.value ? otherwise : then);
    for (const operation of taken) r.operations.push(operation);
    return;
  }
  const yes = collect(r, then);
  const no = collect(r, otherwise);
  const all = [...yes, ...no];
  spend(r, at, all.length);
  const read = new Set(bitsOf(condition));
  const changes = all.some((operation, k) => k < all.length - 1 && read.has(bitWritten(operation)));
  if (changes) {
    const bit = holdBit(r, at);
    emit(r, at, { kind: 'assign', bit, value: condition });
    condition = { kind: 'bit', bit };
  }
  const opposite = negated(condition);
  for (const operation of yes) under(operation, condition);
  for (const operation of no) under(operation, opposite);
  for (const operation of all) r.operations.push(operation);
}

/** Adds an outer condition; the operations are this reader's own and not shared. */
function under(operation: Operation, condition: BitExpression): void {
  const inner = operation.condition;
  const both: BitExpression = inner ? { kind: 'and', of: [condition, inner] } : condition;
  Object.assign(operation, { condition: both });
}

function runFor(r: Reader, { at, name, over, body }: Of<'for'>): void {
  const before = r.problems.errors.length;
  for (const value of loopValues(r, over)) {
    spend(r, at, 1);
    r.scopes.push(new Map([[name.name, integerMeaning(value)]]));
    for (const statement of body) execute(r, statement);
    r.scopes.pop();
    // one round shows the mistakes of the body; more rounds would only repeat them
    if (r.problems.errors.length > before) break;
  }
}
