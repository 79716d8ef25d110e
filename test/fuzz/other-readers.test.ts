/**
 * Hostile matrices, expressions and device files: each ends with a value or an InputError, never with another
 * error, and a limit is met before anything large is built.
 */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { InputError } from '../../src/input-error.ts';
import { readDevice } from '../../src/read/device.ts';
import { readExpression } from '../../src/read/expression.ts';
import { readMatrixMarket } from '../../src/read/matrix-market.ts';
import { checkUnitary } from '../../src/read/unitary.ts';

const RUNS = { seed: 61, numRuns: 500 };

/** Resolves to the codes of the mistakes, or none; everything but an InputError goes through. */
async function codesOf(run: () => unknown): Promise<string[]> {
  try {
    await run();
    return [];
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    for (const { message } of error.problems) {
      expect(message.length).toBeLessThan(600);
      expect(message).not.toMatch(/undefined|\[object/);
    }
    return error.problems.map(({ code }) => code);
  }
}

const matrixOf = (text: string) => () => checkUnitary(readMatrixMarket(text, 'm.mtx'), 'm.mtx');
const expressionOf = (text: string) => async () => checkUnitary(await readExpression(text), text);
const deviceOf = (text: string) => () => readDevice(text, 'd.json');

describe('Matrix Market', () => {
  const HEADER = '%%MatrixMarket matrix array complex general\n';
  test.each<[string, string]>([
    ['a huge size', `${HEADER}100000 100000\n1 0\n`],
    ['a size beyond 2^53', `${HEADER}${'9'.repeat(400)} 2\n`],
    ['a negative size', `${HEADER}-2 -2\n`],
    ['no entries', `${HEADER}2 2\n`],
    ['too many entries', `${HEADER}1 1\n${'1 0\n'.repeat(1_000_000)}`],
    ['entries that are no numbers', `${HEADER}1 1\nNaN Infinity\n`],
    ['entries that overflow', `${HEADER}1 1\n1e999 0\n`],
    ['zeros', `${HEADER}2 2\n${'0 0\n'.repeat(4)}`],
    ['huge entries', `${HEADER}2 2\n${'1e300 1e300\n'.repeat(4)}`],
    ['three rows', `${HEADER}3 3\n${'1 0\n'.repeat(9)}`],
    ['not square', `${HEADER}1 2\n1 0\n0 0\n`],
    ['one row', `${HEADER}1 1\n1 0\n`],
    ['a long line', `${HEADER}${' '.repeat(3_000_000)}2 2\n`],
    ['only comments', `${HEADER}${'% gauge\n'.repeat(300_000)}`],
    ['nothing', ''],
  ])(
    '%s',
    async (_, text) => {
      expect((await codesOf(matrixOf(text))).length).toBeGreaterThan(0);
    },
    20_000,
  );

  test('random lines (seed 61)', async () => {
    const part = fc.constantFrom(
      '2',
      '1',
      '0',
      '-1',
      '1e5',
      'nan',
      '%',
      '%%MatrixMarket',
      'matrix',
      'array',
      'complex',
      'general',
      '\n',
      ' ',
    );
    const text = fc.array(part, { maxLength: 40 }).map((parts) => HEADER + parts.join(' '));
    await fc.assert(
      fc.asyncProperty(text, async (t) => void (await codesOf(matrixOf(t)))),
      RUNS,
    );
  });
});

describe('expressions', () => {
  test.each<[string, string]>([
    ['nothing', ''],
    [
      'a huge product',
      `${Array.from({ length: 20 }, () => 'kron(').join('')}cx${', cx)'.repeat(20)}`,
    ],
    ['a huge identity', 'identity(1e9)'],
    ['a huge power', 'x^1e300'],
    ['an exponential that overflows', 'expm(1e300*x)'],
    ['division by zero', 'x/0'],
    ['an assignment', 'x = 3'],
    ['a function definition', 'f(x) = x'],
    ['names of the host', 'constructor'],
    ['access to properties', 'x.constructor.constructor("return process")()'],
    ['import', 'import("fs")'],
    ['deep brackets', `${'('.repeat(50_000)}x${')'.repeat(50_000)}`],
    ['deep signs', `${'-'.repeat(50_000)}x`],
    ['a long text', `x${'*x'.repeat(200_000)}`],
    ['ragged rows', '[[1, 0], [1]]'],
    ['a matrix of matrices', '[[x, y], [y, x]]'],
    ['a range', '1:1000000000'],
    ['a text', '"x"'],
    ['sizes that do not fit', 'x * cx'],
    ['not unitary', 'x + z'],
    ['an unknown name', 'unknown7'],
    ['wrong numbers of angles', 'rz'],
    ['not finite', 'exp(1e9) * x'],
  ])(
    '%s',
    async (_, text) => {
      expect((await codesOf(expressionOf(text))).length).toBeGreaterThan(0);
    },
    20_000,
  );

  test('random words (seed 61)', async () => {
    const word = fc.constantFrom(
      ...'x y cx rz swap kron expm exp i pi ( ) [ ] , ; + - * / ^ 2 0.5 1e300 = . : % ! adjoint inv "a" \' diag identity'.split(
        ' ',
      ),
    );
    const text = fc.array(word, { maxLength: 20 }).map((words) => words.join(' '));
    await fc.assert(
      fc.asyncProperty(text, async (t) => void (await codesOf(expressionOf(t)))),
      RUNS,
    );
  });

  test('random characters (seed 61)', async () => {
    const text = fc.string({ unit: 'binary', maxLength: 60 });
    await fc.assert(
      fc.asyncProperty(text, async (t) => void (await codesOf(expressionOf(t)))),
      RUNS,
    );
  });
});

describe('device files', () => {
  test.each<[string, string]>([
    ['nothing', ''],
    ['not JSON', '{ links: }'],
    ['null', 'null'],
    ['a list', '[]'],
    ['no links', '{}'],
    ['deep lists', '['.repeat(20_000) + ']'.repeat(20_000)],
    ['huge numbers', '{"wireCount": 1e300, "links": []}'],
    ['numbers that overflow', '{"links": [{"wires": [0, 1], "error": 1e999}]}'],
    ['a prototype', '{"__proto__": {"links": []}, "constructor": 3}'],
    ['wrong kinds', '{"links": 7, "wires": "all", "wireCount": true}'],
  ])(
    '%s',
    async (_, text) => {
      expect((await codesOf(deviceOf(text))).length).toBeGreaterThan(0);
    },
    20_000,
  );

  test('random JSON (seed 61)', async () => {
    const key = fc.constantFrom(
      'links',
      'wires',
      'wireCount',
      'allWires',
      'allLinks',
      't1Us',
      'error',
      'durationNs',
      'resetError',
      'name',
      'x',
    );
    const value = fc.letrec((tie) => ({
      any: fc.oneof(
        { depthSize: 'small' },
        fc.constantFrom<unknown>(null, true, 0, 1, -1, 0.5, 1e300, 'a', '0-1'),
        fc.array(tie('any'), { maxLength: 3 }),
        fc.dictionary(key, tie('any'), { maxKeys: 4 }),
      ),
    })).any;
    const file = fc.dictionary(key, value, { maxKeys: 6 });
    await fc.assert(
      fc.asyncProperty(file, async (f) => void (await codesOf(deviceOf(JSON.stringify(f))))),
      RUNS,
    );
  });
});
