/** Inputs meant to break a command: texts, matrices, expressions and devices, by name. */

const HEAD = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n';
const HEAD_2 = 'OPENQASM 2.0;\ninclude "qelib1.inc";\n';
const MATRIX = '%%MatrixMarket matrix array complex general\n';

const nested = (n: number, open: string, inner: string, close: string): string =>
  open.repeat(n) + inner + close.repeat(n);

const doubling = Array.from(
  { length: 60 },
  (_, k) => `gate g${k + 1} a { g${k} a; g${k} a; }`,
).join('\n');

/** OpenQASM texts that must be refused. */
export const REFUSED: { readonly [name: string]: string } = {
  nothing: '',
  'only zeros': '\0'.repeat(5000),
  'a huge index': `${HEAD}qubit[3] q; h q[1000000000];`,
  'a huge register': `${HEAD}qubit[1000000000] q; h q;`,
  'a huge bit register': `${HEAD}qubit q; bit[1000000000] c;`,
  'deep parentheses': `${HEAD}qubit q; rx(${nested(100_000, '(', '1', ')')}) q;`,
  'deep braces': `${HEAD}qubit q; ${nested(100_000, '{', 'x q;', '}')}`,
  'deep ifs': `${HEAD}qubit q; bit c; ${nested(100_000, 'if (c) {', 'x q;', '}')}`,
  'a gate in itself': `${HEAD}gate g a { g a; } qubit q; g q;`,
  'gates in each other': `${HEAD}gate g a { f a; } gate f a { g a; } qubit q; f q;`,
  'a loop of 1e9 rounds': `${HEAD}qubit q; for int i in [0:1000000000] { x q; }`,
  'gates that double 60 times': `${HEAD}gate g0 a { h a; x a; }\n${doubling}\nqubit q; g60 q;`,
  'a power of 1e300': `${HEAD}qubit q; pow(1e300) @ x q;`,
  'zero by zero': `${HEAD}qubit q; rx(0/0) q;`,
  'one by zero': `${HEAD}qubit q; rx(1/0) q;`,
  'the logarithm of -1': `${HEAD_2}qreg q[1]; rx(ln(-1)) q[0];`,
  'broadcasts in a loop': `${HEAD}qubit[5000] a; qubit[5000] b; for int i in [0:9999] { cx a, b; }`,
  'a sum of a million': `${HEAD}qubit q; rx(${'1+'.repeat(1_000_000)}1) q;`,
  'a parity of 600,000': `${HEAD}qubit q; bit[2] c; c[0] = ${'c[1]^'.repeat(600_000)}c[0];`,
  'a fractional power of a wide gate': `${HEAD}gate g a, b, c, d, e, f, i, j { h a; h b; } qubit[8] q; pow(0.5) @ g q[0], q[1], q[2], q[3], q[4], q[5], q[6], q[7];`,
  'a file of the host': `${HEAD}include "/etc/passwd";`,
  'another version': 'OPENQASM 99.9;\nqubit q;',
  'an opaque gate': `${HEAD_2}opaque m a; qreg q[1]; m q[0];`,
  'a name of a million letters': `${HEAD}qubit ${'a'.repeat(1_000_000)}; h b;`,
  'a comparison of 60,000 bits': `${HEAD}qubit q; bit[60000] c; for int i in [0:99] { if (c < 12345) x q; }`,
};

/** OpenQASM texts that are allowed, and meant to make whoever takes them work without end. */
export const ALLOWED: { readonly [name: string]: string } = {
  'names of the host': `${HEAD}qubit __proto__; h __proto__; qubit constructor; x constructor; gate toString a { h a; } toString constructor;`,
  'bits named as the host': `${HEAD}qubit q; bit __proto__; __proto__ = measure q; if (__proto__) x q; __proto__ = measure q;`,
  'conditions that double': `${HEAD}qubit[2] q; bit[2] c; h q; c = measure q; for int i in [0:59] { c[0] = c[0] && c[1] || (c[0] ^ c[1]); c[1] = c[0] ^ c[1] || c[0]; } if (c[0]) x q[0]; c[1] = measure q[0];`,
  'parities that double': `${HEAD}qubit q; bit[2] c; c[0] = measure q; for int i in [0:60] { c[0] = c[0] ^ c[1]; c[1] = c[1] ^ c[0]; }`,
  'a wire used 1000 times': `${HEAD}qubit q; bit[1000] c; for int i in [0:999] { h q; c[i] = measure q; reset q; }`,
  'conditions on 64 bits': `${HEAD}qubit[2] q; bit[64] c; for int i in [0:63] { h q[0]; c[i] = measure q[0]; if (c == 12345678901) x q[1]; }`,
  'conditions on 30 bits': `${HEAD}qubit[30] q; bit[30] c; h q; c = measure q; reset q; for int i in [0:29] { if (c < 77777) x q[i]; } c = measure q;`,
  '39 controls': `${HEAD}qubit[40] q; ctrl(39) @ x ${Array.from({ length: 40 }, (_, k) => `q[${k}]`).join(', ')};`,
  '8 controls': `${HEAD}qubit[9] q; ctrl(8) @ h ${Array.from({ length: 9 }, (_, k) => `q[${k}]`).join(', ')};`,
  'huge angles': `${HEAD}qubit[2] q; rx(1e300) q[0]; cx q[0], q[1]; rz(-1e308) q[1]; rx(1e-320) q[0];`,
  'no gate': `${HEAD}qubit q;`,
  'only barriers': `${HEAD}qubit[3] q; barrier; barrier q;`,
  'only a phase': `${HEAD}qubit q; gphase(1);`,
  'annotations of no output': `${HEAD}qubit[2] q; @wiregauge.enters 99999999999\nreset q[0]; h q[0]; @wiregauge.leaves 99999999999999999999999\nmeasure q[0];`,
  'an output that leaves twice': `${HEAD}qubit q; bit[2] c; @wiregauge.enters 1\nreset q; h q; @wiregauge.leaves 0\nc[0] = measure q; @wiregauge.enters 0\nreset q; @wiregauge.leaves 0\nc[1] = measure q;`,
  'a power of a gate of 100,000': `${HEAD}gate g a { ${'t a; '.repeat(100_000)} } qubit q; pow(2) @ g q;`,
  'lines that end as on other systems': `${HEAD}qubit q;\nh q;\n`.replaceAll('\n', '\r\n'),
  'a mark of byte order': `\uFEFF${HEAD}qubit q; h q;`,
  'a program that nobody looks at': `${HEAD}qubit[2] q; bit[3] c; h q[0]; reset q[0];`,
  'a thousand wires': `${HEAD}qubit[1000] q; h q;`,
};

export const MATRICES: { readonly [name: string]: string } = {
  'a huge size': `${MATRIX}100000 100000\n1 0\n`,
  'a size that is not there': `${MATRIX}4096 4096\n1 0\n`,
  'a size as 1e9': `${MATRIX}1e9 1e9\n`,
  'a negative size': `${MATRIX}-2 2\n`,
  'a hermitian header': '%%MatrixMarket matrix array complex hermitian\n2 2\n1 0\n0 0\n1 0\n',
  'a symmetric header': '%%MatrixMarket matrix array complex symmetric\n2 2\n1 0\n0 0\n1 0\n',
  'a pattern': '%%MatrixMarket matrix array pattern general\n2 2\n',
  'half a header': '%%MatrixMarket',
  'no numbers': `${MATRIX}2 2\nnan nan\n1 0\n0 0\n0 0\n`,
  'numbers that overflow': `${MATRIX}2 2\n${'1e308 1e308\n'.repeat(4)}`,
  'a list of 999,999,999 entries': '%%MatrixMarket matrix coordinate complex general\n2 2 999999999\n1 1 1 0\n', // biome-ignore format: one line each
  'a million entries too many': `${MATRIX}1 1\n${'1 0\n'.repeat(1_000_000)}`,
};

export const EXPRESSIONS: { readonly [name: string]: string } = {
  'kron fifty times': `${'kron('.repeat(50)}x${',x)'.repeat(50)}`,
  'a sum of 49,000': Array.from({ length: 49_000 }, () => 'x').join('+'),
  'a sum of a million': Array.from({ length: 1_000_000 }, () => 'x').join('+'),
  'a thousand products of 256 rows': Array.from({ length: 1000 }, () => 'identity(256)').join('*'),
  'two thousand sums of 256 rows': Array.from({ length: 2000 }, () => 'identity(256)').join('+'),
  '200 exponentials of 256 rows': Array.from({ length: 200 }, () => 'expm(i*identity(256))').join(
    '*',
  ),
  'a power of 1e308': 'x^1e308',
  'towers of powers': Array.from({ length: 3000 }, () => 'x').join('^'),
  'a huge identity': 'identity(1e9)',
  'an exponential that overflows': 'expm(1e300*x)',
  'zero by zero': 'rz(0/0)',
  'overflow and back': 'exp(1000)*x/exp(1000)',
  'names of the host': '__proto__',
  constructor: 'constructor',
  'a method of texts': 'toString',
  'a module': 'import("fs")',
  'deep brackets': '['.repeat(100_000),
  'deep signs': `${'-'.repeat(5000)}x`,
  'deep adjoints': `x${"'".repeat(5000)}`,
  'an index': 'x[1]',
  'a property': 'x.y',
  'a function': 'f(x) = x',
  'a text': '"a"',
  'two lines': 'x\nz',
  'no inverse': 'inv(x - x)',
};

export const DEVICES: { readonly [name: string]: string } = {
  'a list': '[]',
  'no JSON': 'nullx',
  'deep lists': '['.repeat(100_000),
  'a prototype': '{"links": [[0, 1]], "__proto__": {"a": 1}}',
  'links as a text': '{"links": "x"}',
  'a link to nowhere': '{"links": [[0, 1e9]]}',
  'a link to itself': '{"links": [[0, 0]]}',
  'a link of three': '{"links": [[0, 1, 2]]}',
  'a number as a text': '{"links": [{"between": [0, 1], "error": "NaN"}]}',
  'too many wires': '{"links": [[0, 1]], "wireCount": 1e9}',
  'a negative time': '{"links": [[0, 1]], "wires": [{"t1Us": -1}]}',
  'nothing for all': '{"links": [[0, 1]], "allWires": null}',
  '300,000 links': `{"links": ${JSON.stringify(Array.from({ length: 300_000 }, () => [0, 1]))}}`,
  '200,000 wires': `{"links": [[0, 1]], "wires": ${JSON.stringify(Array.from({ length: 200_000 }, () => ({})))}}`,
};
