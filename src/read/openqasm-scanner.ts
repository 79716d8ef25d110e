/**
 * Cuts OpenQASM text into words, one at a time: the current word lies in the scanner itself, nothing is
 * stored, so that long texts need no memory for their words. Characters that mean nothing become a word of
 * kind `bad`, which is a mistake only for whoever wants to use it: skipping over a refused block stays silent.
 */
import { fail, type Problems } from './openqasm-problems.ts';

export type WordKind =
  | 'name'
  | 'integer'
  | 'real'
  | 'imaginary'
  | 'timing'
  | 'string'
  | 'symbol'
  | 'hardware'
  | 'bad'
  | 'end';

export type Scanner = {
  problems: Problems;
  text: string;
  /** Where scanning goes on. */
  position: number;
  kind: WordKind;
  /** The current word: its text (without quotes for strings), its start and its end. */
  word: string;
  start: number;
  end: number;
  /** End of the word before the current one. */
  previousEnd: number;
  previousWord: string;
  /** The current word is the first on its line. */
  firstOnLine: boolean;
  /** Nesting of expressions, see the limit in the expression parser. */
  depth: number;
};

const SYMBOLS_3 = new Set(['**=', '<<=', '>>=']);
const SYMBOLS_2 = new Set('-> ++ ** == != <= >= && || << >> += -= *= /= &= |= ~= ^= %='.split(' '));
const SYMBOLS_1 = new Set('()[]{},;:.+-*/%=<>!&|^~@#'.split(''));
const NUMBER =
  /0[xX][0-9a-fA-F_]+|0[oO][0-7_]+|0[bB][01_]+|(?:[0-9][0-9_]*(?:\.[0-9_]*)?|\.[0-9][0-9_]*)(?:[eE][+-]?[0-9][0-9_]*)?/y;
const UNIT = /[ \t]*(dt|ns|us|µs|μs|ms|s|im)(?![\p{L}\p{N}_])/uy;
const NAME = /[\p{L}\p{Nl}_][\p{L}\p{Nl}\p{Nd}\p{Mn}\p{Mc}_]*/uy;

/** A scanner that stands on the first word. */
export function scannerOf(problems: Problems): Scanner {
  const { text } = problems;
  const scanner: Scanner = {
    problems,
    text,
    position: text.charCodeAt(0) === 0xfeff ? 1 : 0,
    kind: 'end',
    word: '',
    start: 0,
    end: 0,
    previousEnd: 0,
    previousWord: '',
    firstOnLine: true,
    depth: 0,
  };
  advance(scanner);
  return scanner;
}

/** Moves to the next word. */
export function advance(s: Scanner): void {
  s.previousEnd = s.end;
  s.previousWord = s.word;
  skipBlanks(s);
  const start = s.position;
  s.start = start;
  scanWord(s, s.text, start);
}

function scanWord(s: Scanner, text: string, start: number): undefined {
  if (start >= text.length) return settle(s, 'end', '', text.length);
  const code = text.charCodeAt(start);
  if (isLetter(code)) {
    let at = start + 1;
    while (at < text.length && (isLetter(text.charCodeAt(at)) || isDigit(text.charCodeAt(at))))
      at++;
    if (text.charCodeAt(at) < 128 || at >= text.length) {
      return settle(s, 'name', text.slice(start, at), at);
    }
  }
  if (isDigit(code) || (code === 46 && isDigit(text.charCodeAt(start + 1)))) return scanNumber(s);
  if (code === 34 || code === 39) return scanString(s, text[start]!);
  if (code === 36) {
    let at = start + 1;
    while (isDigit(text.charCodeAt(at))) at++;
    return settle(s, at > start + 1 ? 'hardware' : 'bad', text.slice(start, at), at);
  }
  const three = text.slice(start, start + 3);
  if (SYMBOLS_3.has(three)) return settle(s, 'symbol', three, start + 3);
  const two = text.slice(start, start + 2);
  if (SYMBOLS_2.has(two)) return settle(s, 'symbol', two, start + 2);
  if (SYMBOLS_1.has(text[start]!)) return settle(s, 'symbol', text[start]!, start + 1);
  NAME.lastIndex = start;
  const name = NAME.exec(text);
  if (name) return settle(s, 'name', name[0], start + name[0].length);
  const character = String.fromCodePoint(text.codePointAt(start)!);
  return settle(s, 'bad', character, start + character.length);
}

/** Longer names are refused: nobody reads them, and messages would have to show them. */
const NAME_LENGTH_MAX = 256;

function settle(s: Scanner, kind: WordKind, word: string, end: number): undefined {
  s.kind = kind === 'name' && word.length > NAME_LENGTH_MAX ? 'bad' : kind;
  s.word = word;
  s.end = end;
  s.position = end;
}

const isDigit = (code: number): boolean => code >= 48 && code <= 57;
const isLetter = (code: number): boolean =>
  (code >= 97 && code <= 122) || (code >= 65 && code <= 90) || code === 95;

/** Skips white space and comments; an unfinished comment is a mistake where it begins. */
function skipBlanks(s: Scanner): void {
  const { text } = s;
  let at = s.position;
  let newLine = at === 0;
  for (; at < text.length; at++) {
    const code = text.charCodeAt(at);
    if (code === 10) newLine = true;
    else if (code === 47 && text.charCodeAt(at + 1) === 47) {
      const end = text.indexOf('\n', at);
      if (end < 0) {
        at = text.length;
        break;
      }
      at = end;
      newLine = true;
    } else if (code === 47 && text.charCodeAt(at + 1) === 42) {
      const end = text.indexOf('*/', at + 2);
      if (end < 0) {
        s.position = text.length;
        s.kind = 'end';
        s.start = text.length;
        s.end = text.length;
        fail(s.problems, at, 'unterminated', "missing '*/' to end the comment that begins here");
      }
      at = end + 1;
    } else if (code !== 32 && code !== 9 && code !== 13 && code !== 12 && code !== 0xa0) break;
  }
  s.position = at;
  s.firstOnLine = newLine;
}

function scanNumber(s: Scanner): undefined {
  NUMBER.lastIndex = s.start;
  const match = NUMBER.exec(s.text);
  const word = match ? match[0] : s.text[s.start]!;
  let end = s.start + word.length;
  let kind: WordKind = /^0[xXoObB]/.test(word) || /^[0-9_]+$/.test(word) ? 'integer' : 'real';
  UNIT.lastIndex = end;
  const unit = UNIT.exec(s.text);
  if (unit) {
    kind = unit[1] === 'im' ? 'imaginary' : 'timing';
    end += unit[0].length;
  } else {
    // letters that touch a number belong to it, and make it a word that nobody can use
    let at = end;
    while (isLetter(s.text.charCodeAt(at)) || isDigit(s.text.charCodeAt(at))) at++;
    if (at > end) {
      kind = 'bad';
      end = at;
    }
  }
  settle(s, kind, s.text.slice(s.start, end), end);
}

function scanString(s: Scanner, quote: string): undefined {
  const close = s.text.indexOf(quote, s.start + 1);
  const lineEnd = s.text.indexOf('\n', s.start);
  const limit = lineEnd < 0 ? s.text.length : lineEnd;
  if (close < 0 || close > limit) return settle(s, 'bad', s.text.slice(s.start, limit), limit);
  settle(s, 'string', s.text.slice(s.start + 1, close), close + 1);
}

/** The rest of the line after `from`, trimmed of blanks and a carriage return; moves past it. */
export function restOfLine(s: Scanner, from: number): string {
  const lineEnd = s.text.indexOf('\n', from);
  const end = lineEnd < 0 ? s.text.length : lineEnd;
  const rest = s.text.slice(from, end).trim();
  s.position = end;
  s.end = from + s.text.slice(from, end).trimEnd().length;
  s.word = rest;
  advance(s);
  return rest;
}

/** True when the current word is the symbol or keyword `word`. */
export function stands(s: Scanner, word: string): boolean {
  return s.word === word && (s.kind === 'symbol' || s.kind === 'name');
}

/** Moves past `word` if it stands here. */
export function accept(s: Scanner, word: string): boolean {
  if (!stands(s, word)) return false;
  advance(s);
  return true;
}

/** Moves past `word`, or reports it missing at the end of the word before. */
export function expect(s: Scanner, word: string, purpose: string): void {
  if (accept(s, word)) return;
  refuseBad(s);
  const after = s.previousWord ? ` after ${show(s.previousWord)}` : '';
  const message = `expected '${word}' ${purpose}${after}, got ${found(s)}`;
  fail(s.problems, s.previousEnd, 'unexpected', message);
}

/** Moves past a name and returns it, or reports what stands here instead. */
export function expectName(s: Scanner, what: string): string {
  if (s.kind !== 'name') expected(s, what);
  const name = s.word;
  advance(s);
  return name;
}

/** Reports that `what` should stand here; where it is plainly missing, the place is the end of the word before. */
export function expected(s: Scanner, what: string, hint?: string): never {
  refuseBad(s);
  const missing = s.kind === 'end' || s.firstOnLine || /^[;)\]},{]$/.test(s.word);
  const at = missing ? s.previousEnd : s.start;
  return fail(s.problems, at, 'unexpected', `expected ${what}, got ${found(s)}`, hint);
}

/** A word that is no word is told as such. */
function refuseBad(s: Scanner): void {
  if (s.kind !== 'bad') return;
  const { word, start } = s;
  if (word.startsWith('"') || word.startsWith("'")) {
    fail(s.problems, start, 'unterminated', `missing ${word[0]} to end the text that begins here`);
  }
  if (word.length > NAME_LENGTH_MAX && /^[\p{L}\p{Nl}_]/u.test(word)) {
    const message = `names must have at most ${NAME_LENGTH_MAX} characters, got ${word.length}`;
    fail(s.problems, start, 'too-large', message);
  }
  const what = /^[0-9.]/.test(word) ? 'number' : 'character';
  fail(s.problems, start, `bad-${what}`, `unknown ${what}: ${show(word)}`);
}

/** The current word as messages name it. */
export function found(s: Scanner): string {
  return s.kind === 'end' ? 'the end of the file' : show(s.word);
}

function show(word: string): string {
  const code = word.codePointAt(0) ?? 0;
  if (code < 32 || (code >= 127 && code < 160)) {
    return `U+${code.toString(16).toUpperCase().padStart(4, '0')}`;
  }
  return `'${word.length > 40 ? `${word.slice(0, 37)}...` : word}'`;
}
