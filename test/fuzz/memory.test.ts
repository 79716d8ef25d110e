/** The texts that make the reader work hardest, in a process that would die beyond 400 MB of heap. */
import { spawnSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { expect, test } from 'vitest';

const HEAD = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n';
const loop = 'for int i in [0:999999] ';

const CASES: readonly (readonly [string, string])[] = [
  [`qubit q; ${loop}{ rx(i) q; }`, 'too-large'],
  [`qubit[5000] a; qubit[5000] b; ${loop}{ cx a, b; }`, 'too-large'],
  [`qubit[10000] q; ${loop}{ barrier; }`, 'too-large'],
  [`qubit q; bit[100000] c; ${loop}{ c = ~c; }`, 'too-large'],
  [`qubit q; bit[10000] c; ${loop}{ if (c == 5) { x q; c[1] = 1; x q; } }`, 'too-large'],
  ['gate g a { h a; x a; } qubit q; pow(1000000) @ g q;', 'too-large'],
  [
    `gate g a, b, c, d, e, f { h a; } qubit[6] q; ${loop}{ pow(0.5) @ g q[0], q[1], q[2], q[3], q[4], q[5]; }`,
    'too-large',
  ],
  [`qubit q; bit c; ${'if (c) { '.repeat(60)}${loop}x q;${' }'.repeat(60)}`, 'too-large'],
  [`qubit[100] q;\n${'rz(0.1) q[7];\ncx q[3], q[4];\n'.repeat(50_000)}`, '100000 operations'],
];

test('hostile texts need less than 400 MB', () => {
  const script = fileURLToPath(new URL('read-texts.ts', import.meta.url));
  const { status, stdout, stderr } = spawnSync(
    process.execPath,
    ['--import', 'tsx', '--max-old-space-size=400', script],
    {
      input: JSON.stringify(CASES.map(([body]) => HEAD + body)),
      encoding: 'utf8',
      maxBuffer: 1 << 26,
    },
  );
  expect({ status, stderr }).toEqual({ status: 0, stderr: '' });
  expect(JSON.parse(stdout)).toEqual(CASES.map(([, outcome]) => outcome));
}, 90_000);
