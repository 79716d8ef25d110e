import { describe, expect, test } from 'vitest';
import { formatProblem, InputError, nearestWord } from '../src/input-error.ts';

describe('InputError', () => {
  test('puts the position at the end, then the hint, and leaves out what is missing', () => {
    expect(
      formatProblem({
        code: 'unknown-gate',
        message: 'unknown gate: cxx',
        file: 'valley.qasm',
        line: 7,
        column: 1,
        hint: 'did you mean cx?',
      }),
    ).toBe('unknown gate: cxx at valley.qasm:7:1 (did you mean cx?)');
    expect(formatProblem({ code: 'x', message: 'missing target' })).toBe('missing target');
  });

  test('keeps every problem of a file, one line each', () => {
    const error = new InputError([
      { code: 'a', message: 'first', line: 1, column: 2 },
      { code: 'b', message: 'second', line: 3, column: 4 },
    ]);
    expect(error.message).toBe('first at 1:2\nsecond at 3:4');
    expect(error.code).toBe('a');
    expect(error.problems).toHaveLength(2);
  });
});

describe('nearestWord', () => {
  const known = ['cx', 'cz', 'swap', 'measure', '--tolerance'];
  test.each([
    ['cxx', 'cx'],
    ['mesure', 'measure'],
    ['swpa', 'swap'],
    ['--tolerence', '--tolerance'],
  ])('%s is a slip for %s', (word, expected) => {
    expect(nearestWord(word, known)).toBe(expected);
  });
  test('a word far from all others has no neighbour', () => {
    expect(nearestWord('entangle', known)).toBeUndefined();
  });
});
