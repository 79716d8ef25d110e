import { describe, expect, test } from 'vitest';
import { InputError } from '../../src/input-error.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const HEAD = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n';
const HEAD_2 = 'OPENQASM 2.0;\ninclude "qelib1.inc";\n';

/** All mistakes, as `line:column message (hint)`. */
function mistakesOf(text: string): string[] {
  try {
    readCircuit(text, 'bad.qasm');
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    expect(error.problems.every(({ file }) => file === 'bad.qasm')).toBe(true);
    return error.problems.map(
      ({ line, column, message, hint }) =>
        `${line}:${column} ${message}${hint ? ` (${hint})` : ''}`,
    );
  }
  return [];
}

// every mistake of a text is told once, at its place (for a missing word: the end of the word before), and
// nothing is told that only follows from another mistake
const TEXTS: readonly (readonly [string, readonly string[]])[] = [
  [
    `${HEAD}qubit[2] q;\nh q[0]\ncx q[0], q[1];`,
    ["4:7 expected ';' to end the statement after ']', got 'cx'"],
  ],
  [
    `${HEAD}qubit[2] q;\ncx q[0] q[1];\nh q[0];`,
    ["4:8 expected ';' to end the statement after ']', got 'q'"],
  ],
  [`${HEAD}qubit[2] q;\ncxx q[0], q[1];`, ['4:1 unknown gate: cxx (did you mean cx?)']],
  [`${HEAD}qubit[2] q;\nh r[0];`, ['4:3 unknown qubit register: r']],
  [
    `${HEAD}qubit[2] q;\nh q[2];\nh q[-3];`,
    ['4:5 index of q must be in [-2, 1], got 2', '5:5 index of q must be in [-2, 1], got -3'],
  ],
  [`${HEAD}qubit[2] q;\ncx q[1], q[1];`, ['4:10 gate cx uses the same qubit twice']],
  [`${HEAD}qubit[2] q;\nqubit[3] q;`, ['4:10 already declared: q']],
  [
    `${HEAD}qubit[2] q;\nrx q[0];\nrx(1, 2) q[0];`,
    ['4:1 gate rx takes 1 angle, got 0', '5:1 gate rx takes 1 angle, got 2'],
  ],
  [`${HEAD}qubit[2] q;\nccx q[0], q[1];`, ['4:1 gate ccx takes 3 qubits, got 2']],
  [
    `${HEAD}qubit[2] a; qubit[3] b;\ncx a, b;`,
    ['4:7 expected registers of one length, got 2 and 3 qubits'],
  ],
  [
    `${HEAD}qubit[2] q; bit[3] c;\nc = measure q;\nmeasure q -> c;`,
    ['4:1 expected 2 bits for the outcomes, got 3', '5:14 expected 2 bits for the outcomes, got 3'],
  ],
  [
    `${HEAD}qubit[2] q;\nrx(pi/0) q[0];\nrx(log(0)) q[0];\nrx(sqrt(-1)) q[0];\nrx(10**400) q[0];`,
    [
      '4:6 division by zero',
      '5:4 expected a finite number, got -Infinity',
      '6:4 expected a finite number, got NaN',
      '7:4 expected a finite number, got Infinity',
    ],
  ],
  [`${HEAD}qubit[2] q;\nrx(pii/2) q[0];`, ['4:4 unknown name: pii']],
  [`${HEAD}qubit[2] q;\nrx(sine(1)) q[0];`, ['4:4 unknown function: sine (did you mean sin?)']],
  [`${HEAD}gate g a { h b; }\nqubit q;\ng q;`, ['3:14 unknown qubit of gate g: b']],
  [`${HEAD}gate g a { g a; }\n`, ['3:12 gate g must not call itself']],
  [
    `${HEAD}gate g a, b { cx a, a; }\ngate f(t) a { rx(u) a; }\n`,
    ['3:21 a gate uses the same qubit twice', '4:18 unknown name: u'],
  ],
  [
    `${HEAD}gate g a {\n  h a;\nqubit q;\nh q;`,
    ["4:7 expected '}' to end the body of gate g, which begins in line 3, got 'qubit'"],
  ],
  [
    `${HEAD}qubit q; bit c;\nif (c { x q; }`,
    ["4:6 expected ')' to end the condition after 'c', got '{'"],
  ],
  [`${HEAD}qubit q; bit c;\nif (c == ) x q;`, ["4:9 expected an expression, got ')'"]],
  [
    `${HEAD}qubit q; bit c;\nif (q) x q;\nc = q;`,
    [
      '4:5 expected a value, got q, which is a qubit register',
      '5:5 expected a value, got q, which is a qubit register',
    ],
  ],
  [
    `${HEAD}qubit q;\nx q;\n/* never ended`,
    ["5:1 missing '*/' to end the comment that begins here"],
  ],
  [
    `${HEAD}qubit q;\nx q;\ninclude "other.inc;\nx q;`,
    ['5:9 missing " to end the text that begins here'],
  ],
  [
    `${HEAD}include "other.inc";\nqubit q;`,
    ['3:1 including other.inc is not supported (only "stdgates.inc" is known here)'],
  ],
  ['OPENQASM 4.0;\nqubit q;', ['1:10 expected version 2.0, 3.0 or 3.1, got 4.0']],
  ['qubit q;\nOPENQASM 3.0;', ['2:1 the version must be the first statement, and only once']],
  [
    'OPENQASM 3.0;\nqubit q;\nh q;\nx q;',
    [
      '3:1 gate h is used without the standard\'s gates (add include "stdgates.inc"; before the first gate)',
    ],
  ],
  [
    `${HEAD}qubit q;\nx q;;\n§ q;\nx q;`,
    ["4:5 expected a statement, got ';'", "5:1 unknown character: '§'"],
  ],
  [
    `${HEAD}qubit[0] q;\nqubit[-1] r;\nqubit[1.5] s;\nqubit[100000] t;`,
    [
      '3:7 the size of a register must be >= 1, got 0',
      '4:7 the size of a register must be >= 1, got -1',
      '5:7 expected the size of a register that is an integer, got 1.5',
      '6:7 100000 qubits: 10000 is the limit here',
    ],
  ],
  [
    `${HEAD}qubit[3] q;\nfor int i in [0:3] { h q[i]; }`,
    ['4:26 index of q must be in [-3, 2], got 3'],
  ],
  [
    `${HEAD}qubit[3] q;\nfor float i in [0:3] { h q[i]; }\nfor i in [0:3] h q[i];`,
    [
      '4:5 loops over float are not supported (write for int i in [0:3] { ... })',
      "5:5 expected a type, got 'i' (write for int i in ...)",
    ],
  ],
  [
    HEAD +
      'def f(int a) -> int { return a; }\nint x = 3;\nwhile (true) { }\nswitch (x) { case 1 { } }\ndelay[100ns] q;\nbox { }\nextern g(int) -> int;\ndefcal x $0 { play; }\ncal { frame f; }\narray[int, 4] a = {1, 2};\ninput angle t;\noutput bit b;\nend;\nstretch s;\ncomplex z;',
    [
      '3:1 subroutines (def) are not supported',
      '4:1 variables of type int are not supported; use const int',
      '5:1 while loops are not supported: their length is not known before the run',
      '6:1 switch is not supported; use if',
      '7:1 delay is not supported: timing belongs to the device',
      '8:1 box is not supported: timing belongs to the device',
      '9:1 external functions (extern) are not supported',
      '10:1 pulse definitions (defcal) are not supported',
      '11:1 pulse blocks (cal) are not supported',
      '12:1 arrays are not supported',
      '13:1 input parameters are not supported; write the value as a const',
      '14:1 output declarations are not supported; every bit is an output',
      '15:1 end is not supported',
      '16:1 stretches are not supported: timing belongs to the device',
      '17:1 variables of type complex are not supported',
    ],
  ],
  [
    `${HEAD}qubit q;\nh $0;\nrx(2im) q;\nrx(3ns) q;`,
    [
      '4:3 physical qubits ($0) are not supported (declare a register: qubit[n] q;)',
      '5:4 complex numbers are not supported here',
      '6:4 times and durations are not supported',
    ],
  ],
  [
    HEAD +
      'qubit[2] q;\nctrl x q[0], q[1];\nctrl(0) @ x q[0];\nctrl @ x q[0];\npow(1e300) @ x q[0];',
    [
      "4:5 expected '@' to end the modifier after 'ctrl', got 'x'",
      '5:6 the number of controls must be >= 1, got 0',
      '6:8 gate x takes 1 qubit and 1 control, got 1',
      '7:1 powers must be in [-1000000, 1000000], got 1e+300',
    ],
  ],
  [
    `${HEAD}qubit[2] q;\nlet a = q[0:5];\nh a;\nlet b = r;\nh b;`,
    ['4:13 index of q must be in [-2, 1], got 5', '6:9 unknown qubit register: r'],
  ],
  [
    `${HEAD}const int n = 2.5;\nconst uint m = -1;\nconst qubit z = 1;\nconst int k = k;`,
    [
      '3:15 expected an integer, got 2.5',
      '4:16 expected an integer >= 0, got -1',
      '5:7 constants of type qubit are not supported',
      '6:15 unknown name: k',
    ],
  ],
  [`${HEAD}qubit[2] q;\nx q[0;\nx q[1];`, ["4:6 expected ']' to match '[' after '0', got ';'"]],
  [
    `${HEAD}qubit[2] q;\nx q[0]];\nx q[1];`,
    ["4:7 expected ';' to end the statement after ']', got ']'"],
  ],
  [
    `${HEAD}qubit[2] q;\nrx(pi q[0];\nx q[1];`,
    ["4:6 expected ',' or ')' between the angles after 'pi', got 'q'"],
  ],
  [`${HEAD}qubit[2] q;\n}\nx q[1];`, ["4:1 unexpected '}': no block is open here"]],
  [
    `${HEAD}qubit q[2];\nx q[0];`,
    ["3:8 expected ';', got '[' (the size stands before the name: qubit[n] q;)"],
  ],
  [
    `${HEAD}qubit q;\nbit[2] c = "101";\nc[0] = 2;\nc[0] += 1;\nd = 1;`,
    [
      '4:12 expected 2 bits, got 3',
      '5:8 expected a whole number that fits 1 bit, got 2',
      '6:6 the assignment += is not supported; use =, &=, |= or ^=',
      '7:1 unknown bit register: d',
    ],
  ],
  [`${HEAD}qubit q;\nelse { x q; }`, ["4:1 unexpected 'else': no if stands before it"]],
  [
    `${HEAD}gate h a { }\ngate U a { }\ngate t2 a { }\ngate t2 a { }`,
    [
      '3:6 gate h is already defined',
      '4:6 gate U is already defined',
      '6:6 gate t2 is already defined',
    ],
  ],
  [
    `${HEAD}qubit[2] q;\nh q[0][1];\nqubit s;\nh s[0];`,
    ['4:7 q[...] is no register: it takes no index', '6:4 s is no register: it takes no index'],
  ],
  [
    `${HEAD}qubit[3] q;\ncx q[0, 1];\nh q[1:0:2];`,
    [
      "4:7 expected ']', got ',' (choose several with a set: q[{0, 2}])",
      '5:4 the step of a range must not be 0',
    ],
  ],
  [
    HEAD_2 +
      'qubit[2] q;\nqreg r[2];\nh r[0:1];\ncreg c[2];\nif (c > 1) x r[0];\nmeasure r[0];\nctrl @ x r[0], r[1];',
    [
      '3:1 qubit belongs to OpenQASM 3, but the text says version 2.0',
      "5:6 expected ']' to match '[' after '0', got ':'",
      "7:6 expected '==' in the condition after 'c', got '>'",
      "8:13 expected '->' and a bit for the outcome after ']', got ';'",
      '9:1 ctrl belongs to OpenQASM 3, but the text says version 2.0',
    ],
  ],
  [
    `${HEAD_2}opaque magic(a) p, q;\nqreg r[2];\nmagic(1) r[0], r[1];\niswap r[0], r[1];`,
    [
      '5:1 gate magic is opaque: it has no definition',
      '6:1 unknown gate: iswap (the header of OpenQASM 2.0 lacks it: define it with gate iswap ... { ... })',
    ],
  ],
  [
    `${HEAD_2}qreg q[2]; creg c[1];\nmeasure q -> c;\nmeasure q[0] -> c;`,
    ['4:14 expected 2 bits for the outcomes, got 1'],
  ],
  [
    `${HEAD}qubit q;\nx q;\n0x q;\n123abc q;\nrx("01") q;\nrx("ab") q;`,
    [
      "5:1 unknown number: '0x'",
      "6:1 unknown number: '123abc'",
      '7:4 expected a constant, got bits that only the run knows',
      "8:4 expected a bit string of 0 and 1, got 'ab'",
    ],
  ],
  [
    `${HEAD}qubit q; bit[2] c;\nx q; cc = measure q;\nif (c == "1") x q;\nif (c[5]) x q;`,
    [
      '4:6 unknown bit register: cc (did you mean c?)',
      '5:7 expected registers of one length, got 2 and 1 bits',
      '6:7 index of c must be in [-2, 1], got 5',
    ],
  ],
  [`${HEAD}gate g(a, a) b { }\nqubit q;\ng(1, 2) q;`, ['3:11 the gate has two parts named a']],
  [
    `${HEAD}gate g a {\n  cx a;\n  h a, a;\n  measure a;\n  x a[0];\n}\nqubit q;\ng q;`,
    [
      '4:3 gate cx takes 2 qubits, got 1',
      '5:8 a gate uses the same qubit twice',
      '6:3 measure is not allowed in a gate body',
      '7:6 a is a single qubit of the gate: it takes no index',
    ],
  ],
  [
    `${HEAD}gate g a {\n  x a\n  y a;\n  zz a;\n}\nqubit q;\ng q`,
    [
      "4:6 expected ';' to end the statement after 'a', got 'y'",
      '6:3 unknown gate: zz (did you mean z?)',
      "9:4 expected ';' to end the statement after 'q', got the end of the file",
    ],
  ],
  [
    `${HEAD}qubit q; bit c;\nif (c) {\n  x q;\n  y r;\n  if (c == 1 { z q; }\n  h q\n}\nx qq;`,
    [
      '6:5 unknown qubit register: r',
      "7:13 expected ')' to end the condition after '1', got '{'",
      "8:6 expected ';' to end the statement after 'q', got '}'",
      '10:3 unknown qubit register: qq (did you mean q?)',
    ],
  ],
  [
    HEAD +
      'qubit[2] q;\nfor int i in [0:1] {\n  rx(i/0) q[i];\n}\nfor int i in [0:1] x q[i;\nx q[7];',
    [
      '5:7 division by zero',
      "7:25 expected ']' to match '[' after 'i', got ';'",
      '8:5 index of q must be in [-2, 1], got 7',
    ],
  ],
  [
    `${HEAD}qubit[2] q;\nfor int i in [0:2000000] { x q[0]; }`,
    ['4:14 loops must have at most 1000000 iterations, got 2000001'],
  ],
  [`${HEAD}qubit q;\nx q;\n@note\n@other`, ['6:7 expected a statement, got the end of the file']],
  [
    `${HEAD}qubit[2] q; bit[2] c;\nmeasure q[{0, 0}] -> c;\nc[{0, 0}] = "11";`,
    [
      '4:1 a measurement uses the same qubit or bit twice',
      '5:1 an assignment writes the same bit twice',
    ],
  ],
  [
    `${HEAD}qubit[2] q; bit b;\nconst int n = b;\nqubit[b] r;\nx q[b];`,
    [
      '4:15 expected a constant, got bits that only the run knows',
      '5:7 expected a constant, got bits that only the run knows',
      '6:5 expected a constant, got bits that only the run knows',
    ],
  ],
  [
    `${HEAD}qubit q;\nreset r;\nbarrier q, s;\nif (t) x q;\nc[0] = measure q;`,
    [
      '4:7 unknown qubit register: r',
      '5:12 unknown qubit register: s',
      '6:5 unknown name: t',
      '7:1 unknown bit register: c',
    ],
  ],
  [
    `${HEAD}const float pi = 3;\ngate pi a { }\nqubit q;\nqubit q2 q3;\nx q;`,
    [
      '3:13 pi is a constant of the language',
      "6:9 expected ';' to end the statement after 'q2', got 'q3'",
    ],
  ],
  [
    `${HEAD}qubit q;\nx(q);\nx q q;\nU(1, 2) q;\ngphase(1) q;\ngphase q;`,
    [
      "4:5 expected a register, got ';'",
      "5:4 expected ';' to end the statement after 'q', got 'q'",
      '6:1 gate U takes 3 angles, got 2',
      '7:1 gate gphase takes 0 qubits, got 1',
      '8:1 gate gphase takes 1 angle, got 0',
    ],
  ],
  [
    HEAD +
      'qubit q;\nif (true) qubit r;\nfor int i in [0:1] { gate g a { } }\nfor int i in [0:1] { bit c; }',
    [
      '4:11 registers must be declared outside of blocks',
      '5:22 gates must be declared outside of blocks',
      '6:22 registers must be declared outside of blocks',
    ],
  ],
  [
    HEAD +
      'qubit q; bit[70] c;\nif (c < 3) x q;\nif (c == 1.5) x q;\nif (c + 1 == 2) x q;\nif (-c == 2) x q;',
    [
      '5:7 expected a whole number to compare bits with, got 1.5',
      '6:7 expected a constant, got bits that only the run knows',
      '7:5 expected a constant, got bits that only the run knows',
    ],
  ],
  ['', ['1:1 expected OpenQASM, got an empty text']],
  ['\n\n', ['1:1 expected OpenQASM, got an empty text']],
  ['hello', ['1:6 expected a register, got the end of the file']],
  ['{}', ["1:1 expected a statement, got '{'"]],
  ['"', ['1:1 missing " to end the text that begins here']],
  ['@', ['1:2 expected a name after @, got the end of the file']],
  ['@x\n', ['1:3 expected a statement, got the end of the file']],
  ['OPENQASM', ['1:9 expected a version number, got the end of the file']],
  ['OPENQASM 3', ["1:11 expected ';' to end the statement after '3', got the end of the file"]],
  ['#', ["1:2 expected 'pragma' after #, got the end of the file"]],
  ['gate', ['1:5 expected a name for the gate, got the end of the file']],
  ['if', ["1:3 expected '(' to begin the condition after 'if', got the end of the file"]],
  ['if (', ['1:5 expected an expression, got the end of the file']],
  ['\u0000\u0001', ['1:1 unknown character: U+0000']],
  ['qubit[', ['1:7 expected an expression, got the end of the file']],
  ['x', ['1:2 expected a register, got the end of the file']],
  [';', ["1:1 expected a statement, got ';'"]],
  ['for int i in', ['1:13 expected a range [a:b] or a set {a, b}, got the end of the file']],
];

describe('malformed texts', () => {
  test.each(TEXTS)('%j', (text, mistakes) => {
    expect(mistakesOf(text)).toEqual(mistakes);
  });

  test('more mistakes than anyone reads are counted', () => {
    const mistakes = mistakesOf(`${HEAD}qubit q;\n${'nope q;\n'.repeat(250)}`);
    expect(mistakes.length).toBe(101);
    expect(mistakes[99]).toBe('103:1 unknown gate: nope');
    expect(mistakes[100]).toBe('undefined:undefined 150 more mistakes are not listed');
  });

  test('a mistake far down in a long text has its line', () => {
    const text = `${HEAD}qubit[3] q;\n${'h q[0]; cx q[0], q[1];\n'.repeat(50_000)}  h q[3];\n`;
    expect(mistakesOf(text)).toEqual(['50004:7 index of q must be in [-3, 2], got 3']);
  });
});
