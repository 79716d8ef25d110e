/**
 * Collects the mistakes of one text and turns offsets into lines and columns.
 *
 * A mistake is reported once per place; whoever reports one then either goes on or gives up the statement
 * (`fail`). What cannot be trusted after a mistake is marked by the callers, so that no mistake is told twice.
 */
import { type InputProblem, nearestWord } from '../input-error.ts';

/** More mistakes than this are counted, not listed. */
export const PROBLEMS_MAX = 100;

/** After that many the text is no longer looked at. */
const MISTAKES_MAX = 10_000;

/** Thrown after a report to leave the current statement; caught where statements begin. */
export class Abandoned extends Error {}

/** Thrown after a report to leave the whole text: a limit was reached and going on has no sense. */
export class Halted extends Error {}

// one of each for all time: a stack trace for every mistake of a long text would be slow, and nobody reads it
const ABANDONED = new Abandoned();
const HALTED = new Halted();

/** Leaves the current statement without a word: its mistake was told elsewhere. */
export function abandon(): never {
  throw ABANDONED;
}

export type Problems = {
  file: string;
  text: string;
  /** Offset of the first character of each line. */
  lineStarts: Int32Array;
  errors: { at: number; problem: InputProblem }[];
  warnings: InputProblem[];
  seen: Set<string>;
  /** Mistakes beyond the limit. */
  unlisted: number;
};

export function problemsOf(text: string, file: string): Problems {
  // two passes over the characters: a list that grows would be slow for millions of lines
  let lines = 1;
  for (let at = 0; at < text.length; at++) if (text.charCodeAt(at) === 10) lines++;
  const lineStarts = new Int32Array(lines);
  for (let at = 0, line = 1; line < lines; at++) {
    if (text.charCodeAt(at) === 10) lineStarts[line++] = at + 1;
  }
  return { file, text, lineStarts, errors: [], warnings: [], seen: new Set(), unlisted: 0 };
}

/** Line and column of an offset, both from 1. */
export function placeOf(problems: Problems, at: number): { line: number; column: number } {
  const { lineStarts } = problems;
  let low = 0;
  let high = lineStarts.length - 1;
  while (low < high) {
    const middle = (low + high + 1) >> 1;
    if (lineStarts[middle]! <= at) low = middle;
    else high = middle - 1;
  }
  return { line: low + 1, column: at - lineStarts[low]! + 1 };
}

export function report(
  problems: Problems,
  at: number,
  code: string,
  message: string,
  hint?: string,
): void {
  const key = `${at} ${code}`;
  if (problems.seen.has(key)) return;
  if (problems.errors.length < PROBLEMS_MAX) problems.seen.add(key);
  if (problems.errors.length >= PROBLEMS_MAX) {
    if (++problems.unlisted >= MISTAKES_MAX) throw HALTED;
    return;
  }
  const place = placeOf(problems, at);
  const problem = { code, message, file: problems.file, ...place, ...(hint ? { hint } : {}) };
  problems.errors.push({ at, problem });
}

/** Reports a mistake and leaves the current statement. */
export function fail(
  problems: Problems,
  at: number,
  code: string,
  message: string,
  hint?: string,
): never {
  report(problems, at, code, message, hint);
  throw ABANDONED;
}

/** Reports that a limit is reached and leaves the whole text. */
export function halt(problems: Problems, at: number, message: string, hint?: string): never {
  report(problems, at, 'too-large', message, hint);
  throw HALTED;
}

export function warn(problems: Problems, at: number, code: string, message: string): void {
  const key = `warning ${at} ${code}`;
  if (problems.seen.has(key) || problems.warnings.length >= PROBLEMS_MAX) return;
  problems.seen.add(key);
  problems.warnings.push({ code, message, file: problems.file, ...placeOf(problems, at) });
}

/** All mistakes in the order of the text. */
export function allProblems(problems: Problems): InputProblem[] {
  const list = [...problems.errors].sort((a, b) => a.at - b.at).map(({ problem }) => problem);
  if (problems.unlisted > 0) {
    list.push({
      code: 'more',
      message:
        problems.unlisted < MISTAKES_MAX
          ? `${problems.unlisted} more mistakes are not listed`
          : `at least ${MISTAKES_MAX} more mistakes are not listed`,
      file: problems.file,
    });
  }
  return list;
}

/** Advice looks at so many known names, and only for names up to this length: it must stay cheap. */
const ADVICE_NAMES_MAX = 500;
const ADVICE_LENGTH_MAX = 40;

/**
 * The known name that was probably meant. Names of one letter resemble everything and get no advice, nor do
 * mistakes that are not listed any more.
 */
export function nearName(
  problems: Problems,
  name: string,
  known: Iterable<string>,
): string | undefined {
  if (name.length < 2 || name.length > ADVICE_LENGTH_MAX) return undefined;
  if (problems.errors.length >= PROBLEMS_MAX) return undefined;
  const some: string[] = [];
  for (const word of known) {
    if (Math.abs(word.length - name.length) < name.length) some.push(word);
    if (some.length >= ADVICE_NAMES_MAX) break;
  }
  return nearestWord(name, some);
}
