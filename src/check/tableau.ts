/**
 * Proves Clifford circuits of any size the same or different, measurements and resets included.
 *
 * Method: every `any` input is paired with a reference wire in a Bell state, so the circuit becomes one stabiliser state
 * (Gottesman, quant-ph/9807006; Choi's correspondence). Its generators are kept as bits, one column per wire, and a gate on
 * one or two lines updates 32 generators at a time. What an observer sees is the subgroup of stabilisers that are
 * trivial on dropped lines and I or Z on measured ones; two circuits are the same exactly when these subgroups agree, signs
 * included. They are compared in reduced echelon form (Aaronson, Gottesman, PRA 70, 052328 (2004), for the phases).
 * Measurements in the middle, resets and conditions that are parities of bits are unfolded to lines of their own (`lines.ts`).
 * Proves: both ways. A difference comes with a Pauli that has different expectations, as input and output.
 * Fails: null when a gate is no Clifford gate on at most `ACTION_LINES_MAX` lines, or the circuit is not gates on lines.
 * Cost: (gates) x (generators / 32), then (generators)^3 / 16 for the echelon form.
 */
import { bitName, type Circuit, wireName } from '../circuit/circuit.ts';
import { PAULI } from '../circuit/gates.ts';
import type { Contract } from '../contract.ts';
import { adjoint, kron, mul } from '../numeric/complex-matrix.ts';
import type { Witness } from '../reports.ts';
import { isAnnotated } from './annotations.ts';
import { type LineGate, type Lines, linesOf } from './lines.ts';
import { unwrittenOutputs } from './observation.ts';

export type TableauAnswer = { isSame: boolean; generators: number; witness: Witness | null };

const PAULIS = [PAULI.I, PAULI.X, PAULI.Z, PAULI.Y];
const LETTERS = ['I', 'X', 'Z', 'Y'];

export function compareTableaus(
  original: Circuit,
  rewritten: Circuit,
  contract: Contract,
  partner: readonly { original: number; rewritten: number }[],
): TableauAnswer | null {
  const n = contract.inputs.length;
  const a = linesOf(original, n, isAnnotated(original), true);
  if (!a?.gates.every(actionOf)) return null;
  const b = linesOf(rewritten, n, isAnnotated(rewritten), true);
  if (!b?.gates.every(actionOf)) return null;
  const unwritten = unwrittenOutputs(original, contract);
  // a bit that neither circuit writes is 0 in both; in only one of them it is for other roads
  const written = partner.filter((pair) => a.lineOfBit[pair.original]! >= 0 || b.lineOfBit[pair.rewritten]! >= 0); // biome-ignore format: one list
  const left = observedGroup(a, contract, unwritten, written.map((pair) => pair.original)); // biome-ignore format: two calls alike
  const right = observedGroup(b, contract, unwritten, written.map((pair) => pair.rewritten)); // biome-ignore format: two calls alike
  if (!left || !right) return null;
  const generators = left.rows.length;
  const odd = lightest(left.rows.filter((row) => signIn(right, row) !== row.sign));
  const other = lightest(right.rows.filter((row) => signIn(left, row) !== row.sign));
  if (!odd && !other) return { isSame: true, generators, witness: null };
  const isOriginal = odd !== null && (other === null || weight(odd) <= weight(other));
  const names = columnNames(original, contract, written);
  return {
    isSame: false,
    generators,
    witness: witnessOf(isOriginal ? odd : other!, isOriginal ? right : left, isOriginal, names),
  };
}

/** Number of columns on which a stabiliser is not the identity. */
function weight({ x, z }: Row): number {
  let sum = 0;
  for (let w = 0; w < x.length; w++) sum += ones(x[w]! | z[w]!);
  return sum;
}

function lightest(rows: readonly Row[]): Row | null {
  return rows.reduce<Row | null>(
    (best, row) => (best === null || weight(row) < weight(best) ? row : best),
    null,
  );
}

/** What each clifford gate does to Paulis: for every pattern of x and z bits the new bits, and whether the sign turns. */
type Action = { size: number; images: Int32Array; flips: Uint8Array };

const ACTION_LINES_MAX = 4;
/** By matrix: gates of one name share theirs. */
const actions = new WeakMap<Float64Array, { action: Action | null }>();

function actionOf({ lines, matrix }: LineGate): Action | null {
  const known = actions.get(matrix);
  if (known) return known.action;
  const action = lines.length <= ACTION_LINES_MAX ? conjugation(matrix, lines.length) : null;
  actions.set(matrix, { action });
  return action;
}

/** Pattern bits: x of line 0, z of line 0, x of line 1, z of line 1 and so on, least significant first. */
function conjugation(u: Float64Array, size: number): Action | null {
  const patterns = 4 ** size;
  const d = 2 ** size;
  const images = new Int32Array(patterns);
  const flips = new Uint8Array(patterns);
  for (let p = 0; p < patterns; p++) {
    const moved = mul(mul(u, pauliOf(p, size), d), adjoint(u, d), d);
    let isFound = false;
    for (let q = 0; q < patterns && !isFound; q++) {
      const other = pauliOf(q, size);
      let re = 0;
      for (let k = 0; k < moved.length; k++) re += moved[k]! * other[k]!;
      if (Math.abs(Math.abs(re) / d - 1) > 1e-9) continue;
      images[p] = q;
      flips[p] = re < 0 ? 1 : 0;
      isFound = true;
    }
    if (!isFound) return null;
  }
  return { size, images, flips };
}

function pauliOf(pattern: number, size: number): Float64Array {
  let product = PAULIS[pattern & 3]!;
  for (let k = 1; k < size; k++)
    product = kron(product, PAULIS[(pattern >> (2 * k)) & 3]!, 2 ** k, 2);
  return product;
}

/** One stabiliser: bits of x and z over the columns, 32 a word, and its sign (1 = minus). */
type Row = { x: Uint32Array; z: Uint32Array; sign: number };
type Group = { rows: Row[]; pivots: Map<number, number>; columns: number };

function observedGroup(
  lines: Lines,
  contract: Contract,
  unwritten: readonly number[],
  bits: readonly number[],
): Group | null {
  const references = contract.inputs.flatMap((rule, line) => (rule === 'any' ? [line] : []));
  const generators = lines.count + references.length;
  const words = Math.ceil(generators / 32);
  const make = (): Uint32Array[] =>
    Array.from({ length: lines.count }, () => new Uint32Array(words));
  const [x, z] = [make(), make()];
  const signs = new Uint32Array(words);
  const set = (column: Uint32Array, k: number): void => {
    column[k >> 5]! |= 1 << (k & 31);
  };
  // generator `line`: Z on the line; for `any` inputs with Z on the reference, and one more, X with X
  for (let line = 0; line < lines.count; line++) set(z[line]!, line);
  references.forEach((line, k) => {
    set(x[line]!, lines.count + k);
  });
  for (const gate of lines.gates) {
    applyAction(actionOf(gate)!, gate.lines, x, z, signs); // all are known to be Clifford gates
  }
  const kept: number[] = [];
  const measured: number[] = [];
  for (const bit of bits) {
    const line = lines.lineOfBit[bit]!;
    // a bit that is never written, or two bits of one line: not for this road
    if (line < 0 || measured.includes(line)) return null;
    measured.push(line);
  }
  for (const output of unwritten) measured.push(lines.lineOfOutput[output]!);
  contract.outputs.forEach((rule, output) => {
    if (rule === 'kept') kept.push(lines.lineOfOutput[output]!);
  });
  // a qubit that is kept and was measured as well
  if (kept.some((line) => lines.dephased.has(line))) return null;
  if ([...kept, ...measured].some((line) => line < 0)) return null;
  const seen = new Set([...kept, ...measured]);
  // a qubit that is kept and measured as well
  if (seen.size < kept.length + measured.length) return null;
  const dropped = Array.from({ length: lines.count }, (_, line) => line).filter(
    (line) => !seen.has(line),
  );
  const rows = Array.from({ length: generators }, (_, k) =>
    rowOf(k, lines.count, references, [...kept, ...measured, ...dropped], x, z, signs),
  );
  return restrictedGroup(rows, references.length + kept.length, measured.length, dropped.length);
}

function applyAction(
  { size, images, flips }: Action,
  lines: readonly number[],
  x: readonly Uint32Array[],
  z: readonly Uint32Array[],
  signs: Uint32Array,
): void {
  const count = 2 * size;
  const columns: Uint32Array[] = [];
  for (const line of lines) columns.push(x[line]!, z[line]!);
  const bits = new Int32Array(count);
  const out = new Int32Array(count);
  for (let w = 0; w < signs.length; w++) {
    let any = 0;
    for (let k = 0; k < count; k++) {
      bits[k] = columns[k]![w]!;
      any |= bits[k]!;
    }
    // no generator of these 32 is on the lines
    if (any === 0) continue;
    let sign = signs[w]!;
    for (let p = 1; p < flips.length; p++) {
      if (!flips[p]) continue;
      let mask = -1;
      for (let k = 0; k < count; k++) mask &= (p >> k) & 1 ? bits[k]! : ~bits[k]!;
      sign ^= mask;
    }
    out.fill(0);
    for (let k = 0; k < count; k++) {
      const image = images[1 << k]!;
      for (let q = 0; q < count; q++) if ((image >> q) & 1) out[q]! ^= bits[k]!;
    }
    signs[w] = sign;
    for (let k = 0; k < count; k++) columns[k]![w] = out[k]!;
  }
}

/** Generator k as a row: references first, then the lines in the order given. */
function rowOf(
  k: number,
  n: number,
  references: readonly number[],
  order: readonly number[],
  x: readonly Uint32Array[],
  z: readonly Uint32Array[],
  signs: Uint32Array,
): Row {
  const words = Math.ceil((references.length + order.length) / 32);
  const row: Row = { x: new Uint32Array(words), z: new Uint32Array(words), sign: bitAt(signs, k) };
  references.forEach((line, column) => {
    // Z of the reference is in generator `line`, X in generator n + column
    if (k === line) row.z[column >> 5]! |= 1 << (column & 31);
    if (k === n + column) row.x[column >> 5]! |= 1 << (column & 31);
  });
  order.forEach((line, at) => {
    const column = references.length + at;
    if (bitAt(x[line]!, k)) row.x[column >> 5]! |= 1 << (column & 31);
    if (bitAt(z[line]!, k)) row.z[column >> 5]! |= 1 << (column & 31);
  });
  return row;
}

function bitAt(words: Uint32Array, k: number): number {
  return (words[k >> 5]! >>> (k & 31)) & 1;
}

/** The stabilisers that are trivial on the dropped columns and I or Z on the measured ones, in reduced echelon form. */
function restrictedGroup(all: Row[], free: number, measured: number, dropped: number): Group {
  const columns = free + measured + dropped;
  let rows = all;
  const clear = (part: 'x' | 'z', column: number): void => {
    const pivot = rows.findIndex((row) => bitAt(row[part], column));
    if (pivot < 0) return;
    const [used] = rows.splice(pivot, 1) as [Row];
    for (const row of rows) if (bitAt(row[part], column)) multiplyInto(row, used);
  };
  rows = [...rows];
  for (let column = free + measured; column < columns; column++) {
    clear('x', column);
    clear('z', column);
  }
  for (let column = free; column < free + measured; column++) clear('x', column);
  // nothing is left on the dropped columns, which may be more in one circuit than in the other
  const words = Math.ceil((free + measured) / 32);
  const shortened = rows.map(({ x, z, sign }) => ({ x: x.slice(0, words), z: z.slice(0, words), sign })); // biome-ignore format: one list
  return echelon(shortened, free + measured);
}

/** Slot 2 c is the x bit of column c, slot 2 c + 1 its z bit. */
function echelon(rows: Row[], columns: number): Group {
  const pivots = new Map<number, number>();
  let rank = 0;
  for (let slot = 0; slot < 2 * columns && rank < rows.length; slot++) {
    const [part, column] = [slot % 2 === 0 ? 'x' : 'z', slot >> 1] as const;
    const found = rows.findIndex((row, k) => k >= rank && bitAt(row[part], column) === 1);
    if (found < 0) continue;
    const pivot = rows[found]!;
    rows[found] = rows[rank]!;
    rows[rank] = pivot;
    rows.forEach((row, k) => {
      if (k !== rank && bitAt(row[part], column)) multiplyInto(row, pivot);
    });
    pivots.set(slot, rank);
    rank++;
  }
  return { rows: rows.slice(0, rank), pivots, columns };
}

/** row <- row * other, with the sign that the product of commuting Paulis has. */
function multiplyInto(row: Row, other: Row): void {
  let power = 2 * row.sign + 2 * other.sign;
  for (let w = 0; w < row.x.length; w++) {
    const [a, b, c, d] = [other.x[w]!, other.z[w]!, row.x[w]!, row.z[w]!];
    const plus = (a & b & d & ~c) | (a & ~b & d & c) | (~a & b & c & ~d);
    const minus = (a & b & c & ~d) | (a & ~b & d & ~c) | (~a & b & c & d);
    power += ones(plus) - ones(minus);
    row.x[w] = c ^ a;
    row.z[w] = d ^ b;
  }
  row.sign = (((power % 4) + 4) % 4) / 2;
}

function ones(word: number): number {
  let v = word - ((word >>> 1) & 0x55555555);
  v = (v & 0x33333333) + ((v >>> 2) & 0x33333333);
  return (((v + (v >>> 4)) & 0x0f0f0f0f) * 0x01010101) >>> 24;
}

/** The sign with which the group holds the Pauli of a row; -1 when it does not hold it at all. */
function signIn({ rows, pivots, columns }: Group, row: Row): number {
  const rest: Row = { x: row.x.slice(), z: row.z.slice(), sign: 0 };
  for (let slot = 0; slot < 2 * columns; slot++) {
    const part = slot % 2 === 0 ? 'x' : 'z';
    if (!bitAt(rest[part], slot >> 1)) continue;
    const pivot = pivots.get(slot);
    if (pivot === undefined) return -1;
    multiplyInto(rest, rows[pivot]!);
  }
  return rest.sign;
}

/** So many parts of a parity are written out. */
const WITNESS_NAMES_MAX = 12;

type Names = { references: string[]; outputs: string[] };

function columnNames(
  original: Circuit,
  contract: Contract,
  partner: readonly { original: number }[],
): Names {
  const references = contract.inputs.flatMap((rule, wire) => (rule === 'any' ? [wireName(original, wire)] : [])); // biome-ignore format: one list
  const kept = contract.outputs.flatMap((rule, wire) => (rule === 'kept' ? [wireName(original, wire)] : [])); // biome-ignore format: one list
  const others = unwrittenOutputs(original, contract).map((wire) => wireName(original, wire));
  return {
    references,
    outputs: [...kept, ...partner.map(({ original: bit }) => bitName(original, bit)), ...others],
  };
}

/** The input that the Pauli fixes on the references, and the parity of outputs it then decides. */
function witnessOf(row: Row, other: Group, isOriginal: boolean, names: Names): Witness {
  const letter = (column: number): string =>
    LETTERS[bitAt(row.x, column) + 2 * bitAt(row.z, column)]!;
  const states: { [letter: string]: string } = { I: '0', X: '+', Y: '-i', Z: '0' };
  const input = names.references.map((name, k) => `${name}=${states[letter(k)]}`).join(' ');
  const parts = names.outputs.flatMap((name, k) => {
    const here = letter(names.references.length + k);
    return here === 'I' ? [] : [`${name}:${here}`];
  });
  const shown = parts.slice(0, WITNESS_NAMES_MAX).join(' ');
  const more =
    parts.length > WITNESS_NAMES_MAX ? ` and ${parts.length - WITNESS_NAMES_MAX} more` : '';
  const held = signIn(other, row);
  // an even parity is the +1 outcome of the Pauli; the Bell pair transposes Y, which the state -i takes in
  const even = (sign: number): number => (sign < 0 ? 0.5 : sign === 0 ? 1 : 0);
  const [own, its] = [even(row.sign), even(held)];
  return {
    input: input === '' ? 'all wires in |0>' : input,
    output: `even parity of ${shown}${more}`,
    probabilityOriginal: isOriginal ? own : its,
    probabilityRewritten: isOriginal ? its : own,
  };
}
