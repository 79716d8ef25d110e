/**
 * The one error class for mistakes of the user or of the data. Every message follows one grammar:
 * lower case, `expected X, got Y` / `unknown X: v` / `missing X` / `X must be in R, got v`, with the
 * offending value in it. The shell adds the position and the hint; nothing here prints.
 */
export type InputProblem = {
  /** Short stable name of the kind of mistake, for example `unknown-gate`. */
  code: string;
  message: string;
  file?: string;
  /** 1-based. */
  line?: number;
  /** 1-based, counted in UTF-16 code units. */
  column?: number;
  hint?: string;
};

export class InputError extends Error {
  override readonly name = 'InputError';
  readonly code: string;
  /** All mistakes found in one input, in the order of the text; never empty. */
  readonly problems: readonly InputProblem[];

  constructor(problems: InputProblem | readonly InputProblem[]) {
    const list = Array.isArray(problems)
      ? (problems as InputProblem[])
      : [problems as InputProblem];
    super(list.map(formatProblem).join('\n'));
    this.code = list[0]?.code ?? 'unknown';
    this.problems = list;
  }
}

/** `message at file:line:column (hint)`, on one line; parts that are missing are left out. */
export function formatProblem(problem: InputProblem): string {
  const { message, file, line, column, hint } = problem;
  const place = [file, line, column].filter((part) => part !== undefined).join(':');
  return shortened(message) + (place ? ` at ${place}` : '') + (hint ? ` (${shortened(hint)})` : '');
}

/** A message repeats what it is about, which may be a word of any length: nobody reads more than this of it. */
const MESSAGE_LENGTH_MAX = 1000;

export function shortened(text: string): string {
  return text.length <= MESSAGE_LENGTH_MAX ? text : `${text.slice(0, MESSAGE_LENGTH_MAX - 3)}...`;
}

/** The known word nearest to `word` by edit distance, if it is near enough to be a slip of the hand. */
export function nearestWord(word: string, known: Iterable<string>): string | undefined {
  let best: string | undefined;
  let bestDistance = Math.max(1, Math.floor(word.length / 3)) + 1;
  for (const candidate of known) {
    if (Math.abs(candidate.length - word.length) >= bestDistance) continue;
    const distance = editDistance(word.toLowerCase(), candidate.toLowerCase());
    if (distance < bestDistance) {
      best = candidate;
      bestDistance = distance;
    }
  }
  return best;
}

/**
 * Number of slips between two words: a letter wrong, missing, too many, or two neighbours swapped (Damerau,
 * Commun. ACM 7, 171 (1964); restricted form), three rows of the table at a time.
 */
function editDistance(a: string, b: string): number {
  let beforePrevious: number[] = [];
  let previous = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const row = [i];
    for (let j = 1; j <= b.length; j++) {
      const substitution = previous[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1);
      let best = Math.min(previous[j]! + 1, row[j - 1]! + 1, substitution);
      const isSwap = i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1];
      if (isSwap) best = Math.min(best, beforePrevious[j - 2]! + 1);
      row.push(best);
    }
    beforePrevious = previous;
    previous = row;
  }
  return previous[b.length]!;
}
