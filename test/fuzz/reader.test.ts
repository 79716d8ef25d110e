/**
 * Hostile texts: whatever comes in, the reader ends with a circuit or an InputError, never with another
 * error, and in bounded time and memory. The bounds themselves are watched by a generous limit per case (the
 * machine may be slow) and by the sizes of what comes out.
 */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { InputError } from '../../src/input-error.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const HEAD = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n';
const RUNS = { seed: 41, numRuns: 400 };

type Outcome = { operations: number } | { codes: string[]; message: string };

/** Reads and tells what came of it; everything but an InputError goes through. */
function outcomeOf(text: string): Outcome {
  try {
    return { operations: readCircuit(text, 'fuzz.qasm').circuit.operations.length };
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    expect(error.problems.length).toBeGreaterThan(0);
    const isTooLong = text.length > 20_000_000;
    for (const { message, line, column, code } of error.problems) {
      expect(message.length).toBeLessThan(400);
      expect(message).not.toMatch(/undefined|NaN:|\[object/);
      if (code !== 'more' && !isTooLong)
        expect([line, column].every((n) => n !== undefined && n >= 1)).toBe(true);
    }
    return { codes: error.problems.map(({ code }) => code), message: error.message };
  }
}

/** The one kind of mistake that a hostile text must end with. */
function codeOf(text: string): string {
  const outcome = outcomeOf(text);
  return 'codes' in outcome ? (outcome.codes[0] ?? 'none') : `${outcome.operations} operations`;
}

describe('hostile texts end in a clear message', () => {
  const nested = (n: number, open: string, inner: string, close: string): string =>
    open.repeat(n) + inner + close.repeat(n);
  const doubling = (levels: number): string => {
    let text = 'gate g0 a { h a; x a; }\n';
    for (let k = 1; k <= levels; k++) text += `gate g${k} a { g${k - 1} a; g${k - 1} a; }\n`;
    return `${text}qubit q;\ng${levels} q;`;
  };
  const ladder = (levels: number): string => {
    let text = 'gate g0 a { h a; }\n';
    for (let k = 1; k <= levels; k++) text += `gate g${k} a { g${k - 1} a; }\n`;
    return `${text}qubit q;\ng${levels} q;`;
  };

  test.each<[string, string, string]>([
    ['a huge index', 'qubit[3] q; h q[99999999999999];', 'index-out-of-range'],
    ['an index beyond 2^53', `qubit[3] q; h q[${'9'.repeat(400)}];`, 'too-large'],
    ['a huge register', 'qubit[1000000000] q;', 'too-large'],
    ['many registers', 'qubit[9999] a; qubit[9999] b;', 'too-large'],
    ['a huge bit register', 'qubit q; bit[999999999] c;', 'too-large'],
    ['a huge range', 'qubit[3] q; h q[0:1:2000000000];', 'index-out-of-range'],
    ['a loop of 1e9 rounds', 'qubit q; for int i in [0:1000000000] { x q; }', 'too-large'],
    [
      'loops in loops',
      `qubit q; ${nested(5, 'for int i in [0:9999] { ', 'x q;', ' }')}`,
      'too-large',
    ],
    ['empty loops in loops', nested(5, 'for int i in [0:9999] { ', '', ' }'), 'too-large'],
    ['a huge power of one gate', 'qubit q; pow(1e300) @ x q;', 'too-large'],
    [
      'a huge power of a defined gate',
      'gate g a { h a; x a; } qubit q; pow(1000000) @ g q;',
      'too-large',
    ],
    [
      'powers of powers',
      `gate g a { h a; x a; } qubit q; ${'pow(1000) @ '.repeat(5)}g q;`,
      'too-large',
    ],
    ['an exponent that is no number', 'qubit q; pow(sqrt(-1)) @ x q;', 'not-finite'],
    ['an angle that is no number', 'qubit q; rx(sqrt(-1)) q;', 'not-finite'],
    ['an infinite angle', 'qubit q; rx(1e400) q;', 'not-finite'],
    ['an angle that overflows', 'qubit q; rx(1e300 * 1e300) q;', 'not-finite'],
    ['an integer that overflows', 'qubit q; rx(9007199254740991 * 9) q;', 'too-large'],
    [
      'a fractional power of a wide gate',
      `gate g ${[...'abcdefgh'].join(', ')} { h a; h b; } qubit[8] q; pow(0.5) @ g q[0], q[1], q[2], q[3], q[4], q[5], q[6], q[7];`,
      'too-large',
    ],
    ['definitions that double', doubling(40), 'too-large'],
    ['definitions in a ladder', ladder(5000), 'too-deep'],
    ['a gate that calls itself', 'gate g a { g a; } qubit q; g q;', 'recursive-gate'],
    [
      'gates that call each other',
      'gate g a { f a; } gate f a { g a; } qubit q; f q;',
      'unknown-gate',
    ],
    ['deep parentheses', `qubit q; rx(${nested(100_000, '(', '1', ')')}) q;`, 'too-deep'],
    ['deep signs', `qubit q; rx(${'-'.repeat(100_000)}1) q;`, 'too-deep'],
    ['deep powers', `qubit q; rx(${'1**'.repeat(100_000)}1) q;`, 'too-deep'],
    ['deep functions', `qubit q; rx(${nested(50_000, 'sin(', '1', ')')}) q;`, 'too-deep'],
    ['deep blocks', `qubit q; bit c; ${nested(50_000, 'if (c) { ', 'x q;', ' }')}`, 'too-deep'],
    ['deep ifs without blocks', `qubit q; bit c; ${'if (c) '.repeat(50_000)} x q;`, 'too-deep'],
    [
      'a long chain of else if',
      `qubit q; bit c; if (c) x q; ${'else if (c) x q; '.repeat(50_000)}`,
      'too-deep',
    ],
    ['deep loops', nested(50_000, 'for int i in [0:0] { ', '', ' }'), 'too-deep'],
    [
      'deep blocks that never end',
      'qubit q; bit c; '.concat('if (c) { '.repeat(50_000)),
      'too-deep',
    ],
    ['many indices', `qubit[2] q; h q${'[0:1]'.repeat(50_000)};`, 'too-deep'],
    ['many modifiers', `qubit q; ${'inv @ '.repeat(50_000)} x q;`, 'too-deep'],
    ['more controls than wires', 'qubit q; ctrl(1000000000) @ x q;', 'wrong-count'],
    [
      'aliases that double',
      `qubit[1000] q0; ${Array.from({ length: 40 }, (_, k) => `let q${k + 1} = q${k} ++ q${k};`).join('\n')}`,
      'too-large',
    ],
    [
      'broadcasts in a loop',
      'qubit[5000] a; qubit[5000] b; for int i in [0:10000] { cx a, b; }',
      'too-large',
    ],
    ['barriers in a loop', 'qubit[10000] a; for int i in [0:100000] { barrier; }', 'too-large'],
    [
      'wide comparisons in a loop',
      'qubit q; bit[50000] c; bit[50000] d; for int i in [0:100000] { if (c < d) x q; }',
      'too-large',
    ],
    [
      'wide assignments in a loop',
      'qubit q; bit[100000] c; for int i in [0:100000] { c = ~c; }',
      'too-large',
    ],
    ['a long file name', `include "${'x'.repeat(100_000)}";`, 'not-supported'],
    ['a text that is one long word', 'x'.repeat(5_000_000), 'too-large'],
    [
      'long names that differ',
      `qubit ${'x'.repeat(5_000_000)}; h ${'x'.repeat(5_000_000)}y;`,
      'too-large',
    ],
    [
      'many unknown names among many known ones',
      `${Array.from({ length: 9000 }, (_, k) => `qubit gauge_at_weir_${k};`).join('')} ${Array.from({ length: 9000 }, (_, k) => `h gauge_at_wier_${k};`).join('')}`,
      'unknown-name',
    ],
    [
      'many unknown gates among many known ones',
      `qubit q; ${Array.from({ length: 9000 }, (_, k) => `gate sluice_gate_${k} a { }`).join('\n')} ${Array.from({ length: 9000 }, (_, k) => `sluice_gaet_${k} q;`).join('')}`,
      'unknown-gate',
    ],
    ['a text of open brackets', '['.repeat(1_000_000), 'unexpected'],
    ['a text of open braces', '{'.repeat(1_000_000), 'unexpected'],
    ['a text of closing braces', '}'.repeat(100_000), 'unexpected'],
    ['a text of blank lines', '\n'.repeat(19_000_000), 'no-qubits'],
    ['a text beyond the limit', ' '.repeat(20_000_000), 'too-large'],
    ['a text of mistakes of one kind', 'h q;\n'.repeat(700_000), 'unknown-name'],
    ['a text of quotes', '"\n'.repeat(100_000), 'unterminated'],
    ['a text of comments', '/**/'.repeat(500_000), 'no-qubits'],
    ['a comment that never ends', `/*${'*'.repeat(5_000_000)}`, 'unterminated'],
    ['a text of annotations', '@a\n'.repeat(500_000), 'unexpected'],
    ['a long number', `qubit q; rx(${'1'.repeat(1_000_000)}.0) q;`, 'not-finite'],
    ['control characters', '\u0000\u0007\uFFFF'.repeat(10_000), 'bad-character'],
    ['half a surrogate pair', '\uD800;'.repeat(1000), 'bad-character'],
  ])(
    '%s',
    (_, body, code) => {
      expect(codeOf(HEAD + body)).toBe(code);
    },
    20_000,
  );

  test('a long version number', () => {
    const outcome = outcomeOf(`OPENQASM 7.${'0'.repeat(100_000)};`);
    expect(outcome).toMatchObject({ codes: ['version'] });
  });

  test.each<[string, string, number]>([
    ['a sum of 50,000 terms', `qubit q; rx(${'1+'.repeat(50_000)}1) q;`, 1],
    [
      'a parity of 50,000 bits',
      `qubit q; bit[50000] c; bit d; d = ${Array.from({ length: 50_000 }, (_, k) => `c[${k}]`).join(' ^ ')};`,
      1,
    ],
    ['10,000 wires at once', 'qubit[10000] q; h q; barrier; reset q;', 20_001],
    ['a power that is one operation', 'qubit q; pow(999999) @ s q;', 1],
    [
      '40,000 definitions',
      `qubit q; ${Array.from({ length: 40_000 }, (_, k) => `gate g${k} a { h a; }`).join('\n')} g7 q;`,
      1,
    ],
  ])(
    'large but honest: %s',
    (_, body, operations) => {
      expect(outcomeOf(HEAD + body)).toEqual({ operations });
    },
    20_000,
  );
});

describe('random texts (fast-check, seed 41)', () => {
  test('any characters', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary', maxLength: 300 }), (text) => void outcomeOf(text)),
      RUNS,
    );
  });

  test('any bytes, read as UTF-8', () => {
    const bytes = fc.uint8Array({ maxLength: 400 });
    fc.assert(
      fc.property(bytes, (b) => void outcomeOf(new TextDecoder().decode(b))),
      RUNS,
    );
  });

  const WORDS =
    'OPENQASM 3.0 2.0 include "stdgates.inc" "qelib1.inc" qubit bit qreg creg gate q c a b h cx rx U gphase ctrl negctrl ' +
    'inv pow @ ( ) [ ] { } ; , : = == != < > && || ! ~ ^ & | + - * / % ** ++ -> 0 1 2 3 0.5 1e300 pi if else for int uint in const ' +
    'float let measure reset barrier opaque def while "01" @note #pragma // /* */ \n . $0 2im 5ns true';
  const word = fc.constantFrom(...WORDS.split(' '));

  test('any words of the language in any order', () => {
    const text = fc.array(word, { maxLength: 60 }).map((words) => HEAD + words.join(' '));
    fc.assert(
      fc.property(text, (t) => void outcomeOf(t)),
      { ...RUNS, numRuns: 1500 },
    );
  });

  const SAMPLE = `${HEAD}gate pair(t) w, v { h w; ctrl @ rx(t / 2) w, v; gphase(t); }
qubit[4] q;
bit[4] c;
const int n = 3;
let half = q[0:1] ++ q[{3}];
for int i in [0:n - 1] { pair(pi / 4) q[i], q[i + 1]; }
pow(0.5) @ pair(1) q[0], q[1];
@wiregauge.leaves 0
c[0] = measure q[0];
reset q[0];
if (c[0] && !c[1] || c == 5) { x q[1]; c[1] = measure q[1]; z q[2]; } else { y q[3]; }
c[2] = c[0] ^ c[1];
measure q -> c;
`;

  test('a good text cut off anywhere', () => {
    for (let end = 0; end < SAMPLE.length; end++) outcomeOf(SAMPLE.slice(0, end));
    expect(outcomeOf(SAMPLE)).toMatchObject({ operations: 19 });
  });

  test('a good text with one character lost, doubled or exchanged', () => {
    const place = fc.nat(SAMPLE.length - 1);
    const other = fc.constantFrom(...' ;,()[]{}"=@/*\n0aq-'.split(''), '\u0000');
    fc.assert(
      fc.property(place, fc.nat(2), other, (at, kind, character) => {
        const middle = kind === 0 ? '' : kind === 1 ? SAMPLE[at]!.repeat(2) : character;
        outcomeOf(SAMPLE.slice(0, at) + middle + SAMPLE.slice(at + 1));
      }),
      { ...RUNS, numRuns: 1500 },
    );
  });

  test('a good text with a word put in or taken out', () => {
    const words = SAMPLE.split(/(?<=[\s;,()[\]{}])/);
    fc.assert(
      fc.property(fc.nat(words.length - 1), fc.nat(3), word, (at, count, extra) => {
        outcomeOf([...words.slice(0, at), ` ${extra} `, ...words.slice(at + count)].join(''));
      }),
      { ...RUNS, numRuns: 1500 },
    );
  });
});
