/**
 * Hostile input to the program itself: files, expressions, options and certificates. Each run ends by itself with exit code 0 to 3, one
 * short message where it refuses, and at most 500 MB. A run is ended after twenty seconds, which is a failure; the times are printed.
 */
import { spawnSync } from 'node:child_process';
import { existsSync, mkdtempSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs'; // biome-ignore format: one import
import { tmpdir } from 'node:os';
import { join, resolve } from 'node:path';
import { pathToFileURL } from 'node:url';
import { afterAll, beforeAll, describe, expect, test, vi } from 'vitest';
import { random } from '../../src/numeric/random.ts';
import { DEVICES, EXPRESSIONS, MATRICES, REFUSED } from './hostile-inputs.ts';

const root = resolve(import.meta.dirname, '../..');
const program = join(root, 'dist/cli.js');
const folder = mkdtempSync(join(tmpdir(), 'wiregauge-hostile-'));
const RUN_MS_MAX = 20_000;
// several runs a test
vi.setConfig({ testTimeout: 240_000 });
const MEGABYTES_MAX = 500;
const times: [string, number][] = [];

/** The newest change below a folder, in milliseconds. */
function newest(path: string): number {
  const own = statSync(path);
  if (!own.isDirectory()) return own.mtimeMs;
  return Math.max(...readdirSync(path).map((name) => newest(join(path, name))));
}

const watcher = `import { isMainThread } from 'node:worker_threads';
import { writeFileSync } from 'node:fs';
if (isMainThread) process.on('exit', () => writeFileSync(process.env.PEAK_FILE, String(process.resourceUsage().maxRSS)));
`;

beforeAll(() => {
  // a program older than its sources would be tested in their place
  const changed = Math.max(newest(join(root, 'src')), newest(join(root, 'workers')));
  if (!existsSync(program) || statSync(program).mtimeMs < changed) {
    const { status, stderr } = spawnSync('node', ['build.mjs'], { cwd: root, encoding: 'utf8' });
    if (status !== 0) throw new Error(`the build failed: ${stderr}`);
  }
  writeFileSync(join(folder, 'watcher.mjs'), watcher);
}, 120_000);

afterAll(() => {
  times.sort((a, b) => b[1] - a[1]);
  const shown = times.slice(0, 5).map(([name, ms]) => `${name} ${(ms / 1000).toFixed(2)} s`);
  console.log(`${times.length} runs of the program; slowest: ${shown.join(', ')}`);
  rmSync(folder, { recursive: true, force: true });
});

type Run = { status: number | null; stdout: string; stderr: string };

/** Runs the program and checks what holds for every run. */
function wiregauge(...words: string[]): Run {
  const peakFile = join(folder, 'peak.txt');
  writeFileSync(peakFile, '');
  const watch = pathToFileURL(join(folder, 'watcher.mjs')).href;
  const started = performance.now();
  const { status, signal, stdout, stderr } = spawnSync(
    'node',
    ['--import', watch, program, ...words],
    {
      cwd: folder,
      encoding: 'utf8',
      maxBuffer: 1 << 26,
      timeout: RUN_MS_MAX,
      env: { ...process.env, PEAK_FILE: peakFile },
    },
  );
  const name = words.map((word) => (word.length < 40 ? word : `${word.slice(0, 37)}...`)).join(' ');
  times.push([name, performance.now() - started]);
  const megabytes = Number(readFileSync(peakFile, 'utf8')) / 1024;
  expect({ name, signal, isFault: status === 70, stderr: status === 70 ? stderr : '' }).toEqual({ name, signal: null, isFault: false, stderr: '' }); // biome-ignore format: one check
  expect([0, 1, 2, 3]).toContain(status);
  expect(stderr).not.toMatch(/\n\s+at /);
  expect({ name, isLarge: !(megabytes > 0 && megabytes < MEGABYTES_MAX) }).toEqual({
    name,
    isLarge: false,
  });
  return { status, stdout, stderr };
}

/** The run refuses, in few words. */
function refused(...words: string[]): string {
  const { status, stdout, stderr } = wiregauge(...words);
  expect({ words: words.map((word) => word.slice(0, 60)), status, stdout }).toMatchObject({ status: 2, stdout: '' }); // biome-ignore format: one check
  expect(stderr.length).toBeGreaterThan(10);
  expect(stderr.length).toBeLessThan(3000);
  return stderr;
}

function file(name: string, content: string | Uint8Array): string {
  writeFileSync(join(folder, name), content);
  return name;
}

describe('files', () => {
  const some = ['a huge register', 'deep parentheses', 'deep ifs', 'gates that double 60 times', 'a loop of 1e9 rounds', 'a sum of a million', 'only zeros']; // biome-ignore format: one list
  test.each(some)('a circuit: %s', (name) => {
    refused('survey', file('hostile.qasm', REFUSED[name]!), '--quiet');
  });

  test('bytes of no text (seed 5)', () => {
    const draw = random(5);
    const bytes = Uint8Array.from({ length: 100_000 }, () => Math.floor(256 * draw()));
    for (const name of ['bytes.qasm', 'bytes.mtx', 'bytes.json']) {
      refused('survey', file(name, bytes), '--quiet');
    }
    refused('narrow', 'cx', '--device', 'bytes.json', '--quiet');
    refused('compare', '--recheck', 'bytes.json', '--quiet');
  });

  test.each(['a huge size', 'a million entries too many', 'numbers that overflow'])(
    'a matrix: %s',
    (name) => {
      refused('build', file('hostile.mtx', MATRICES[name]!), '--quiet');
    },
  );

  test.each(['deep lists', 'a prototype', 'too many wires'])('a device: %s', (name) => {
    refused('narrow', 'cx', '--device', file('hostile.json', DEVICES[name]!), '--quiet');
  });

  test('a device of 300,000 links is read', () => {
    const device = file('links.json', DEVICES['300,000 links']!);
    expect(wiregauge('build', 'cx', '--device', device, '--quiet').status).toBe(0);
  });

  test('10,000 wires without links are converted', () => {
    const text = 'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[10000] q;\nh q;\n';
    expect(wiregauge('build', file('wide.qasm', text), '--quiet').status).toBe(0);
  });

  test('a file beyond 64 MiB is not read', () => {
    expect(refused('survey', file('long.qasm', new Uint8Array(65 * 1024 * 1024).fill(32)))).toContain('file size must be at most'); // biome-ignore format: one check
  });

  test('a circuit that takes long ends at the time limit', () => {
    const text = 'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[10000] q;\nfor int i in [0:9998] { cx q[i], q[i + 1]; h q[i]; }\n'; // biome-ignore format: one text
    const { status, stderr } = wiregauge('narrow', file('chain.qasm', text), '--time-limit', '1', '--quiet'); // biome-ignore format: one call
    expect(status).toBe(3);
    expect(stderr).toContain('stopped at the time limit');
  });
});

describe('words', () => {
  test.each([
    'a thousand products of 256 rows',
    'kron fifty times',
    'a sum of 49,000',
    'names of the host',
    'a module',
  ])('an expression: %s', (name) => {
    refused('survey', EXPRESSIONS[name]!, '--quiet');
  });

  test.each(
    [
      [['compare', 'cx', 'cx', '--map', '='.repeat(10_000)]],
      [['compare', 'cx', 'cx', '--map', 'q[99999999999999999999]=q[0]']],
      [['compare', 'cx', 'cx', '--map', '__proto__=constructor']],
      [['build', 'cx', '--links', '0-1e9']],
      [['build', 'cx', '--native', 'cx,'.repeat(20_000)]],
      [['build', 'cx', '--native', '__proto__,rz,sx']],
      [['survey', 'cx', '--input-of', '99999999999999999999=any']],
      [['survey', 'cx', '--tolerance', 'NaN']],
      [['survey', 'cx', '--seed', '1e300']],
      [['survey', 'cx', '--workers', '1000000000']],
      [['narrow', 'cx', '--time-limit', '-1']],
      [['build', 'cx', '--entanglers', 'Infinity']],
    ].map(([words]) => [words!.map((word) => word.slice(0, 30)).join(' '), words!] as const),
  )('%s', (_, words) => {
    refused(...words, '--quiet');
  });
});

describe('certificates', () => {
  const [a, b] = ['hxh.qasm', 'z.qasm'];
  const text = (gates: string): string =>
    `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit q;\n${gates}\n`;
  beforeAll(() => {
    file(a, text('h q; x q; h q;'));
    file(b, text('z q;'));
  });

  test('there is none without an answer', () => {
    const wide = (gate: string): string => `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[30] q;\nfor int i in [0:28] { ry(0.3) q[i]; cx q[i], q[i + 1]; }\nfor int i in [0:28] { ${gate} q[i]; ch q[i + 1], q[i]; }\n`; // biome-ignore format: one text
    const words = [file('first.qasm', wide('ry(0.5)')), file('second.qasm', wide('rx(0.5)'))];
    const { status } = wiregauge('compare', ...words, '--certificate', 'none.json', '--quiet');
    const isAnswered = status === 0 || status === 1;
    expect(existsSync(join(folder, 'none.json'))).toBe(isAnswered);
    refused('compare', a, 'nowhere.qasm', '--certificate', 'none-either.json', '--quiet');
    expect(existsSync(join(folder, 'none-either.json'))).toBe(false);
  });

  test('a recheck holds, and tells a changed file, a changed number and a changed rule', () => {
    expect(wiregauge('compare', a, b, '--certificate', 'c.json', '--quiet').status).toBe(0);
    const written = readFileSync(join(folder, 'c.json'), 'utf8');
    expect(wiregauge('compare', '--recheck', 'c.json', '--quiet').stdout).toContain(
      'the certificate holds',
    );
    const changes: [RegExp, string, string][] = [
      [/"verdict": "same"/, '"verdict": "different"', 'the verdict was different and is same'],
      [/"hilbertSchmidt": [^,]+/, '"hilbertSchmidt": 0.5', 'the distance was 0.5 and is '],
      [/"contract": "any\/kept"/, '"contract": "any/measured"', 'the contract was any/measured'],
    ];
    for (const [from, to, message] of changes) {
      const changed = file('changed.json', written.replace(from, to));
      const { status, stdout } = wiregauge('compare', '--recheck', changed, '--quiet');
      expect({ status, message: stdout.includes(message) }).toEqual({ status: 1, message: true });
    }
    for (const [from, to] of [
      [/"tolerance": [^,]+/, '"tolerance": "all"'],
      [/"seed": 1/, '"seed": 1, "inputOf": 5'],
      [/"name": "hxh.qasm"/, '"name": {"__proto__": 1}'],
      [/"asked": \{/, '"asked": null, "was": {'],
    ] as const) {
      refused('compare', '--recheck', file('broken.json', written.replace(from, to)), '--quiet');
    }
    file(b, text('s q; s q;'));
    expect(refused('compare', '--recheck', 'c.json', '--quiet')).toContain('expected the rewritten text with hash'); // biome-ignore format: one check
  });

  test('expressions are found again by their text', () => {
    const words = ['kron(h, h) * cx * kron(h, h)', 'swap * cx * swap'];
    expect(wiregauge('compare', ...words, '--certificate', 'e.json', '--quiet').status).toBe(0);
    expect(wiregauge('compare', '--recheck', 'e.json', '--quiet').stdout).toContain(
      'the certificate holds',
    );
  });
});
