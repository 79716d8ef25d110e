/**
 * Reads a dense matrix in Matrix Market form.
 *
 * Shape: the result is planar and row-major; the file lists entries column by column.
 * Accepted: `%%MatrixMarket matrix array complex general` and `array real general` (NIST,
 * math.nist.gov/MatrixMarket/formats.html), with comments, blank lines and any spacing. Other forms of the
 * format (coordinate, symmetric, integer, pattern) are refused by name.
 * Fails: InputError with the position of the first wrong token, or of the end where entries are missing.
 */
import { InputError } from '../input-error.ts';

/** 2^12: the largest dense unitary that the rest can use. */
export const MATRIX_ROWS_MAX = 4096;

export type ReadMatrix = { matrix: Float64Array; rows: number; columns: number };

export function isMatrixMarket(text: string): boolean {
  return /^\s*%%MatrixMarket/i.test(text);
}

export function readMatrixMarket(text: string, name: string): ReadMatrix {
  const fail = (
    code: string,
    message: string,
    line: number,
    column: number,
    hint?: string,
  ): never => {
    throw new InputError({ code, message, file: name, line, column, ...(hint ? { hint } : {}) });
  };
  const parts = headerOf(text, fail);
  const tokens = tokensOf(text);
  const whole = (what: string): number => {
    const { value: token } = tokens.next();
    if (!token) return fail('missing-size', `missing number of ${what}`, ...endOf(text));
    if (!/^\d+$/.test(token.text)) {
      return fail(
        'bad-size',
        `expected the number of ${what}, got ${token.text}`,
        token.line,
        token.column,
      );
    }
    const count = Number(token.text);
    if (count < 1 || count > MATRIX_ROWS_MAX) {
      return fail(
        'too-large',
        `number of ${what} must be in [1, ${MATRIX_ROWS_MAX}], got ${token.text}`,
        token.line,
        token.column,
      );
    }
    return count;
  };
  const rows = whole('rows');
  const columns = whole('columns');
  const matrix = new Float64Array(2 * rows * columns);
  for (let j = 0; j < columns; j++) {
    for (let i = 0; i < rows; i++) {
      for (let part = 0; part < parts; part++) {
        const { value: token } = tokens.next();
        if (!token) {
          const found = (j * rows + i) * parts + part;
          const wanted = rows * columns * parts;
          return fail(
            'missing-entries',
            `expected ${wanted} numbers, got ${found}`,
            ...endOf(text),
          );
        }
        const number = isNumber(token.text) ? Number(token.text) : Number.NaN;
        if (!Number.isFinite(number)) {
          const { line, column } = token;
          return fail('bad-number', `expected a finite number, got ${token.text}`, line, column);
        }
        matrix[part * rows * columns + i * columns + j] = number;
      }
    }
  }
  const { value: extra } = tokens.next();
  if (extra) {
    const message = `expected ${rows * columns * parts} numbers and no more, got ${extra.text}`;
    return fail('extra-entries', message, extra.line, extra.column);
  }
  return { matrix, rows, columns };
}

type Fail = (code: string, message: string, line: number, column: number, hint?: string) => never;

/** Numbers per entry: 2 for complex, 1 for real. */
function headerOf(text: string, fail: Fail): 1 | 2 {
  const first = text.slice(0, Math.max(0, text.search(/[\r\n]|$/)));
  const words = first.trim().toLowerCase().split(/\s+/);
  if (words[0] !== '%%matrixmarket') {
    const got = first.trim().slice(0, 40) || 'an empty line';
    return fail('bad-header', `expected %%MatrixMarket, got ${got}`, 1, 1, 'the first line must be: %%MatrixMarket matrix array complex general'); // biome-ignore format: one call
  }
  const [, object, format, field, symmetry] = words;
  const expected: [string | undefined, readonly string[]][] = [
    [object, ['matrix']],
    [format, ['array']],
    [field, ['complex', 'real']],
    [symmetry, ['general']],
  ];
  for (const [word, allowed] of expected) {
    if (word === undefined || !allowed.includes(word)) {
      const at = word === undefined ? first.length + 1 : first.toLowerCase().indexOf(word, 2) + 1;
      return fail('unsupported-form', `expected ${allowed.join(' or ')}, got ${word ?? 'the end of the line'}`, 1, at); // biome-ignore format: one call
    }
  }
  return field === 'complex' ? 2 : 1;
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
