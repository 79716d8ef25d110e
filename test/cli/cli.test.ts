import { spawn, spawnSync } from 'node:child_process';
import {
  existsSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  statSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join, resolve } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';

const root = resolve(import.meta.dirname, '../..');
const program = join(root, 'dist/cli.js');
const folder = mkdtempSync(join(tmpdir(), 'wiregauge-cli-'));
const example = (name: string): string => join(root, 'src/examples', name);

/** The newest change below a folder, in milliseconds. */
function newest(path: string): number {
  const own = statSync(path);
  if (!own.isDirectory()) return own.mtimeMs;
  return Math.max(...readdirSync(path).map((name) => newest(join(path, name))));
}

beforeAll(() => {
  // a program older than its sources would be tested in their place
  const changed = Math.max(newest(join(root, 'src')), newest(join(root, 'workers')));
  if (!existsSync(program) || statSync(program).mtimeMs < changed) {
    const { status, stderr } = spawnSync('node', ['build.mjs'], { cwd: root, encoding: 'utf8' });
    if (status !== 0) throw new Error(`the build failed: ${stderr}`);
  }
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

type Run = { status: number | null; stdout: string; stderr: string };

function wiregauge(...words: string[]): Run {
  const { status, stdout, stderr } = spawnSync('node', [program, ...words], {
    cwd: folder,
    encoding: 'utf8',
    maxBuffer: 1 << 26,
  });
  return { status, stdout, stderr };
}

function file(name: string, text: string): string {
  writeFileSync(join(folder, name), text);
  return name;
}

describe('help', () => {
  test.each(['', 'survey', 'narrow', 'compare', 'build'])(
    '%s --help is there and short',
    (command) => {
      const { status, stdout, stderr } = wiregauge(...(command ? [command] : []), '--help');
      expect(status).toBe(0);
      expect(stderr).toBe('');
      expect(stdout.split('\n').length).toBeLessThan(50);
      const options = command === '' ? ['survey', 'narrow', 'compare', 'build'] : ['--inputs', '--outputs', '--native', '--device', '--links', '--tolerance', '--seed', '--workers', '--time-limit', '--report', '--json', '--quiet', '--force']; // biome-ignore format: one list
      for (const word of options) expect(stdout).toContain(word);
    },
  );

  test('no command at all shows the help and is a mistake of use', () => {
    expect(wiregauge().status).toBe(2);
  });
});

describe('answers', () => {
  test('survey --json: the report and nothing else, with the keys of the interface', () => {
    const { status, stdout } = wiregauge('survey', example('opening.qasm'), '--json', '--quiet');
    expect(status).toBe(0);
    const report = JSON.parse(stdout);
    expect(report).toMatchObject({
      schema: 'wiregauge/survey@1',
      seed: 1,
      contract: 'any/kept',
      counts: { wires: 4, bits: 0 },
      structure: { width: 4 },
      causal: { width: 3 },
      influence: { method: 'dense', kind: 'kept' },
      openings: [{ leaves: 0, enters: 3 }],
    });
    expect(report.seconds).toBeGreaterThan(0);
    expect(report.structure.reach).toHaveLength(4);
    expect(report.widths.map((row: { contract: string }) => row.contract)).toContain('any/kept');
  });

  test('narrow: exit 0, the file whole, the report beside it, and the check in it', () => {
    const out = join(folder, 'narrow.qasm');
    const report = join(folder, 'narrow.json');
    const run = wiregauge('narrow', example('opening.qasm'), '--out', out, '--report', report);
    expect(run.status).toBe(0);
    expect(run.stdout).toContain('narrowed');
    const text = readFileSync(out, 'utf8');
    expect(text).toMatch(/^OPENQASM 3/);
    expect(text).toContain('@wiregauge.leaves 0');
    const saved = JSON.parse(readFileSync(report, 'utf8'));
    expect(saved).toMatchObject({
      schema: 'wiregauge/narrow@1',
      verdict: 'narrowed',
      after: { wires: 3 },
      check: { proof: true, unfoldedWires: 4 },
      reuse: [{ leaves: 0, enters: 3 }],
      files: [out],
    });
    expect(saved.distance.hilbertSchmidt).toBeLessThan(1e-20);
    expect(readdirSync(folder).filter((name) => name.includes('.tmp-'))).toEqual([]);
    // the program's own check agrees when asked again
    expect(wiregauge('compare', example('opening.qasm'), out, '--quiet').status).toBe(0);
    // nothing is replaced without being told
    const again = wiregauge('narrow', example('opening.qasm'), '--out', out);
    expect(again.status).toBe(2);
    expect(again.stderr).toContain('use --force to replace it');
    expect(readFileSync(out, 'utf8')).toBe(text);
    expect(wiregauge('narrow', example('opening.qasm'), '--out', out, '--force').status).toBe(0);
    expect(readFileSync(out, 'utf8')).toBe(text);
  });

  test('narrow: exit 1 with the bound when nothing can be saved', () => {
    const { status, stdout } = wiregauge('narrow', example('no-opening.qasm'), '--quiet');
    expect(status).toBe(1);
    expect(stdout).toMatch(
      /no equal circuit has fewer than 3 wires: none lets .* by at least 0\.\d+ in process infidelity/,
    );
    expect(stdout).toMatch(/bracket: D is at least 0\.\d+/);
  });

  test('compare: exit 0 for equal, 1 with a witness for different', () => {
    const same = wiregauge('compare', example('relay.qasm'), example('relay-rewritten.qasm'));
    expect(same.status).toBe(0);
    const off = wiregauge('compare', example('relay.qasm'), example('relay-off.qasm'), '--json');
    expect(off.status).toBe(1);
    const report = JSON.parse(off.stdout);
    // one angle off by 1e-3: D = 1 - cos(5e-4)
    expect(report.distance.hilbertSchmidt).toBeCloseTo(1 - Math.cos(5e-4), 12);
    expect(report.witness.probabilityOriginal).not.toBe(report.witness.probabilityRewritten);
  });

  test('a certificate can be rechecked, and notices another text', () => {
    const [a, b] = [file('a.qasm', readFileSync(example('relay.qasm'), 'utf8')), file('b.qasm', readFileSync(example('relay-rewritten.qasm'), 'utf8'))]; // biome-ignore format: two files
    expect(wiregauge('compare', a, b, '--certificate', 'c.json').status).toBe(0);
    const again = wiregauge('compare', '--recheck', 'c.json');
    expect(again.status).toBe(0);
    expect(again.stdout).toContain('the certificate holds');
    file('b.qasm', readFileSync(example('relay-off.qasm'), 'utf8'));
    const changed = wiregauge('compare', '--recheck', 'c.json');
    expect(changed.status).toBe(2);
    expect(changed.stderr).toContain('expected the rewritten text with hash');
  });

  test('build: an expression, a report as a page', () => {
    const page = join(folder, 'swap.html');
    const { status, stdout } = wiregauge(
      'build',
      'swap',
      '--native',
      'cz,u3',
      '--report',
      page,
      '--quiet',
    );
    expect(status).toBe(0);
    expect(stdout).toContain('3 entanglers (proven');
    expect(readFileSync(page, 'utf8')).toMatch(/^<!doctype html>/);
  });

  test('--picture draws before, after and the trade; the page of a report holds them too', () => {
    const picture = join(folder, 'opening.svg');
    const page = join(folder, 'opening.html');
    const run = wiregauge('narrow', example('opening.qasm'), '--picture', picture, '--report', page, '--quiet'); // biome-ignore format: one call
    expect(run.status).toBe(0);
    const svg = readFileSync(picture, 'utf8');
    for (const word of ['Before: ', 'After', 'Wires against depth', 'station[3]']) {
      expect(svg).toContain(word);
    }
    expect(svg.match(/<svg/g)).toHaveLength(4);
    expect(readFileSync(page, 'utf8').match(/<figure>/g)).toHaveLength(3);
    expect(wiregauge('survey', 'swap', '--picture', 'x.png').stderr).toContain(
      'expected a .svg file',
    );
  });

  test('the same bytes for any number of workers', () => {
    const texts = [0, 1, 2].map((workers) => {
      const { status, stdout } = wiregauge('narrow', example('opening.qasm'), '--workers', `${workers}`, '--quiet'); // biome-ignore format: one call
      expect(status).toBe(0);
      return stdout;
    });
    expect(new Set(texts).size).toBe(1);
  });
});

describe('bad input: exit 2, one message at the right place, no trace', () => {
  const header = 'OPENQASM 3;\ninclude "stdgates.inc";\n';
  const malformed: [string, string][] = [
    ['qubit[2] q\nh q[0];\n', '3:11'],
    ['qubit[2] q;\nhh q[0];\n', '4:1'],
    ['qubit[2] q;\nh q[2];\n', '4:5'],
    ['qubit[2] q;\ncx q[0], q[0];\n', '4:10'],
    ['qubit[2] q;\nrx q[0];\n', '4:1'],
    ['qubit[2] q;\nrx(1, 2) q[0];\n', '4:1'],
    ['qubit[2] q;\ncx q[0];\n', '4:1'],
    ['qubit[2] q;\nh r[0];\n', '4:3'],
    ['qubit[2] q;\nqubit q;\n', '4:7'],
    ['qubit[2] q;\nbit[3] c;\nc = measure q;\n', '5:'],
    ['qubit[2] q;\nrx(1/0) q[0];\n', '4:'],
    ['qubit[2] q;\nwhile (true) { h q[0]; }\n', '4:1'],
    ['qubit[2] q;\ndef f() { }\n', '4:1'],
    ['qubit[2] q;\ninput angle t;\n', '4:1'],
    ['qubit[0] q;\n', '3:'],
    ['qubit[2] q;\nh q[0]\n', '4:7'],
    ['qubit[2] q;\nif (c) { h q[0]; }\n', '4:5'],
    ['qubit[2] q;\nrx(pi * ) q[0];\n', '4:'],
    ['qubit[2] q;\nctrl @ q[0];\n', '4:'],
    ['qubit[2] q;\n"text";\n', '4:1'],
    ['qubit[2] q;\nfor int i in [0:1000000000] { h q[0]; }\n', '4:'],
    ['qubit[2] q;\nh q[0]; §\n', '4:9'],
  ];
  test.each(malformed)('%j at %s', (text, place) => {
    const name = file('bad.qasm', header + text);
    const kept = file('kept.qasm', 'untouched');
    const { status, stdout, stderr } = wiregauge(
      'narrow',
      name,
      '--out',
      kept,
      '--force',
      '--quiet',
    );
    expect(status).toBe(2);
    expect(stdout).toBe('');
    expect(stderr).toContain(`bad.qasm:${place}`);
    expect(stderr).not.toMatch(/\n\s+at /);
    expect(readFileSync(join(folder, kept), 'utf8')).toBe('untouched');
  });

  test('every mistake of a file is told', () => {
    const name = file('three.qasm', `${header}qubit[2] q;\nhh q[0];\nh q[5];\nh q[0]\n`);
    const { stderr } = wiregauge('survey', name);
    expect(stderr.trim().split('\n')).toHaveLength(3);
  });

  test.each([
    [['survey', 'nowhere.qasm'], 'missing file: nowhere.qasm'],
    [['survey', '.'], 'expected a file, got a folder'],
    [['survey', 'kron(x'], 'expected a matrix expression'],
    [['survey', '2*x'], 'expected a unitary matrix'],
    [['survey', 'identity(3)'], 'expected 2^n rows'],
    [['narow', 'x'], 'unknown command: narow (did you mean narrow?)'],
    [['survey', 'x', '--inptus', 'any'], 'Did you mean --inputs?'],
    [['survey', 'x', '--inputs', 'some'], 'Allowed choices are any, zero'],
    [['survey', 'x', '--tolerance', '2'], 'expected a number in (0, 1), got 2'],
    [['narrow', 'x', '--wires', '0'], 'expected a whole number in [1, 10000], got 0'],
    [['build', 'x', '--links', '0:1'], 'expected links such as 0-1,1-2, got 0:1'],
    [['build', 'swap', '--native', 'cx,foo'], 'unknown gate in the native set: foo'],
    [['survey', 'x', '--device', 'nowhere.json'], 'missing file: nowhere.json'],
    [['narrow', 'x', '--out', 'no/such/folder.qasm'], 'missing folder: no/such'],
    [['survey', 'x', '--report', 'report.txt'], 'expected a .json or .html file for --report'],
    [['compare', 'cx', 'x'], 'expected 2 wires'],
    [['compare', 'x'], 'missing argument: two circuits to compare'],
    [['compare', '--recheck', 'nowhere.json'], 'missing file: nowhere.json'],
    [['survey', 'x', '--input-of', '0=maybe'], 'expected WIRE=any|zero, got 0=maybe'],
  ])('%j', (words, message) => {
    const { status, stderr } = wiregauge(...words);
    expect(status).toBe(2);
    expect(stderr).toContain(message);
    expect(stderr).not.toMatch(/\n\s+at /);
  });
});

describe('stopping', () => {
  // four generic 4-wire blocks on 7 wires: minutes of work
  const long = (): string => {
    const blocks = ['haar-4'].map((name) => join(root, `reference-unitaries/${name}.mtx`));
    return blocks[0]!;
  };

  test('Ctrl-C ends it soon, with 130', async () => {
    const child = spawn('node', [program, 'build', long(), '--tolerance', '1e-300'], {
      cwd: folder,
    });
    // the first line of progress says that the work has begun
    await new Promise((begun) => child.stderr.once('data', begun));
    child.kill('SIGINT');
    const code = await new Promise((ended) => child.on('exit', (status) => ended(status)));
    expect(code).toBe(130);
  });

  test('a time limit ends it with 3, and what is best so far is written', () => {
    const out = join(folder, 'limited.qasm');
    const { status, stdout } = wiregauge('build', long(), '--tolerance', '1e-300', '--time-limit', '2', '--out', out, '--quiet'); // biome-ignore format: one call
    expect(status).toBe(3);
    expect(stdout).toContain('written:');
    expect(readFileSync(out, 'utf8')).toMatch(/^OPENQASM 3/);
  });

  test('a reader that goes away is no fault', () => {
    const command = `node ${program} survey ${example('opening.qasm')} --quiet | head -1`;
    const { status, stderr } = spawnSync('bash', ['-o', 'pipefail', '-c', command], {
      encoding: 'utf8',
    });
    expect(status).toBe(0);
    expect(stderr).toBe('');
  });
});
