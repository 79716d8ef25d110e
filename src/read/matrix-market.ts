/**
 * Reads a matrix in Matrix Market form.
 *
 * Shape: the result is planar and row-major; an `array` file lists entries column by column.
 * Accepted: `%%MatrixMarket matrix array complex general`, `coordinate` for `array` and `real` for `complex`
 * (NIST, math.nist.gov/MatrixMarket/formats.html), with comments, blank lines and any spacing. Other forms of the
 * format (symmetric, integer, pattern) are refused by name.
 * Fails: InputError with the position of the first wrong token, or of the end where entries are missing.
 */
import { InputError } from '../input-error.ts';

/** 2^12: the largest dense unitary that the rest can use. */
export const MATRIX_ROWS_MAX = 4096;

export type ReadMatrix = { matrix: Float64Array; rows: number; columns: number };

export function isMatrixMarket(text: string): boolean {
  return /^\s*%%MatrixMarket/i.test(text);
}

/** The words of a file, and how to refuse one. */
type Source = { text: string; tokens: Generator<Token, undefined>; fail: Fail };

export function readMatrixMarket(text: string, name: string): ReadMatrix {
  const fail: Fail = (code, message, line, column, hint) => {
    throw new InputError({ code, message, file: name, line, column, ...(hint ? { hint } : {}) });
  };
  const { parts, isSparse } = headerOf(text, fail);
  const source: Source = { text, tokens: tokensOf(text), fail };
  const rows = wholeNumber(source, 'number of rows', 1, MATRIX_ROWS_MAX);
  const columns = wholeNumber(source, 'number of columns', 1, MATRIX_ROWS_MAX);
  const size = rows * columns;
  const entries = isSparse ? wholeNumber(source, 'number of entries', 0, size) : size;
  // a number takes two characters at least: do not make room for what cannot be there
  if (text.length < 2 * entries * parts) failMissing(source, entries * parts);
  const matrix = new Float64Array(2 * size);
  if (isSparse) readSparse(source, matrix, rows, columns, entries, parts);
  else readDense(source, matrix, rows, columns, parts);
  const { value: extra } = source.tokens.next();
  if (extra) {
    const wanted = isSparse ? `${entries} entries` : `${entries * parts} numbers`;
    const message = `expected ${wanted} and no more, got ${short(extra.text)}`;
    return fail('extra-entries', message, extra.line, extra.column);
  }
  return { matrix, rows, columns };
}

function readDense(
  source: Source,
  matrix: Float64Array,
  rows: number,
  columns: number,
  parts: number,
): void {
  for (let j = 0; j < columns; j++) {
    for (let i = 0; i < rows; i++) {
      for (let part = 0; part < parts; part++) {
        const done = (j * rows + i) * parts + part;
        const number = finiteNumber(source, rows * columns * parts, done);
        matrix[part * rows * columns + i * columns + j] = number;
      }
    }
  }
}

/** `row column value`, both from 1, each place at most once. */
function readSparse(
  source: Source,
  matrix: Float64Array,
  rows: number,
  columns: number,
  entries: number,
  parts: number,
): void {
  const isGiven = new Uint8Array(rows * columns);
  for (let k = 0; k < entries; k++) {
    const { value: first } = source.tokens.next();
    if (!first) failMissing(source, entries, k, 'entries');
    else {
      const i = wholeOf(source, first, 'row', 1, rows);
      const j = wholeNumber(source, 'column', 1, columns);
      const at = (i - 1) * columns + j - 1;
      if (isGiven[at]) {
        const message = `expected each entry once, got row ${i}, column ${j} again`;
        source.fail('twice', message, first.line, first.column);
      }
      isGiven[at] = 1;
      for (let part = 0; part < parts; part++) {
        matrix[part * rows * columns + at] = finiteNumber(
          source,
          entries * parts,
          k * parts + part,
        );
      }
    }
  }
}

function failMissing(
  { text, fail }: Source,
  wanted: number,
  got?: number,
  what = 'numbers',
): never {
  const found = got === undefined ? 'a shorter file' : got;
  return fail('missing-entries', `expected ${wanted} ${what}, got ${found}`, ...endOf(text));
}

function finiteNumber(source: Source, wanted: number, done: number): number {
  const { value: token } = source.tokens.next();
  if (!token) return failMissing(source, wanted, done);
  const number = isNumber(token.text) ? Number(token.text) : Number.NaN;
  if (Number.isFinite(number)) return number;
  const message = `expected a finite number, got ${short(token.text)}`;
  return source.fail('bad-number', message, token.line, token.column);
}

function wholeNumber(source: Source, what: string, least: number, most: number): number {
  const { value: token } = source.tokens.next();
  if (!token) return source.fail('missing-size', `missing ${what}`, ...endOf(source.text));
  return wholeOf(source, token, what, least, most);
}

function wholeOf(
  { fail }: Source,
  token: Token,
  what: string,
  least: number,
  most: number,
): number {
  const { text, line, column } = token;
  if (!/^\d+$/.test(text)) {
    return fail('bad-size', `expected the ${what}, got ${short(text)}`, line, column);
  }
  const count = Number(text);
  if (count >= least && count <= most) return count;
  const message = `${what} must be in [${least}, ${most}], got ${short(text)}`;
  return fail('too-large', message, line, column);
}

const short = (text: string): string => (text.length > 40 ? `${text.slice(0, 37)}...` : text);

type Fail = (code: string, message: string, line: number, column: number, hint?: string) => never;

/** Numbers per entry (2 for complex, 1 for real), and whether entries come with their places. */
function headerOf(text: string, fail: Fail): { parts: 1 | 2; isSparse: boolean } {
  const first = text.slice(0, Math.max(0, text.search(/[\r\n]|$/)));
  const words = first.trim().toLowerCase().split(/\s+/);
  if (words[0] !== '%%matrixmarket') {
    const got = first.trim().slice(0, 40) || 'an empty line';
    return fail('bad-header', `expected %%MatrixMarket, got ${got}`, 1, 1, 'the first line must be: %%MatrixMarket matrix array complex general'); // biome-ignore format: one call
  }
  const [, object, format, field, symmetry] = words;
  const expected: [string | undefined, readonly string[]][] = [
    [object, ['matrix']],
    [format, ['array', 'coordinate']],
    [field, ['complex', 'real']],
    [symmetry, ['general']],
  ];
  for (const [word, allowed] of expected) {
    if (word === undefined || !allowed.includes(word)) {
      const at = word === undefined ? first.length + 1 : first.toLowerCase().indexOf(word, 2) + 1;
      return fail('unsupported-form', `expected ${allowed.join(' or ')}, got ${word ?? 'the end of the line'}`, 1, at); // biome-ignore format: one call
    }
  }
  return { parts: field === 'complex' ? 2 : 1, isSparse: format === 'coordinate' };
}

function isNumber(text: string): boolean {
  return /^[+-]?(\d+\.?\d*|\.\d+)([eEdD][+-]?\d+)?$/.test(text) && !/[dD]/.test(text);
}

type Token = { text: string; line: number; column: number };

/** Words after the header line, comments left out, one at a time. */
function* tokensOf(text: string): Generator<Token, undefined> {
  const pattern = /%[^\n]*|\r?\n|[^\s%]+/g;
  pattern.lastIndex = Math.max(0, text.search(/\n|$/));
  let line = 1;
  let lineStart = 0;
  for (let match = pattern.exec(text); match; match = pattern.exec(text)) {
    const word = match[0];
    if (word.endsWith('\n')) {
      line++;
      lineStart = match.index + word.length;
    } else if (!word.startsWith('%')) {
      yield { text: word, line, column: match.index - lineStart + 1 };
    }
  }
  return undefined;
}

function endOf(text: string): [number, number] {
  const lines = text.trimEnd().split('\n');
  return [lines.length, (lines.at(-1)?.length ?? 0) + 1];
}
