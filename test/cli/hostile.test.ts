/**
 * Hostile input through every command: each case ends in one clear message or in an answer, never in a fault, within little time and
 * memory. The commands run in a process of their own that is given long beyond that (machines may be slow); the times are printed.
 */
import { spawnSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { expect, test } from 'vitest';
import type { CommandRequest, Source } from '../../src/commands.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { ALLOWED, DEVICES, EXPRESSIONS, MATRICES, REFUSED } from './hostile-inputs.ts';

type Case = [name: string, request: CommandRequest];
type Ended = { name: string; outcome: string; message: string; seconds: number; megabytes: number };

const COMMANDS = ['survey', 'narrow', 'compare', 'build'] as const;

function requestOf(command: (typeof COMMANDS)[number], source: Source): CommandRequest {
  const options = { seed: 1 };
  switch (command) {
    case 'survey':
    case 'narrow':
      return { command, circuit: source, options };
    case 'compare':
      return { command, original: source, rewritten: source, options };
    case 'build':
      return { command, target: source, options };
  }
}

/** Every input through as many commands as asked for, another choice for each input. */
function withCommands(
  inputs: { readonly [name: string]: string },
  count: number,
  rest: Partial<Source> = {},
): Case[] {
  return Object.entries(inputs).flatMap(([name, text], k) =>
    Array.from({ length: count }, (_, turn): Case => {
      const command = COMMANDS[(k + turn) % COMMANDS.length]!;
      return [`${command}: ${name}`, requestOf(command, { name: 'hostile', text, ...rest })];
    }),
  );
}

/** Runs the cases in one process and gives back how each ended; a case that never ends fails with its name. */
function run(cases: readonly Case[]): Ended[] {
  const script = fileURLToPath(new URL('hostile-commands.ts', import.meta.url));
  const { status, stdout, stderr, signal } = spawnSync(
    process.execPath,
    ['--import', 'tsx', '--max-old-space-size=400', script],
    { input: JSON.stringify(cases), encoding: 'utf8', maxBuffer: 1 << 28, timeout: 280_000 },
  );
  const lines = stdout.trim().split('\n').map((line) => JSON.parse(line) as Ended); // biome-ignore format: one list
  const last = lines.at(-1);
  expect({ status, signal, stderr, last: last?.outcome === 'started' ? last.name : '' }).toEqual({ status: 0, signal: null, stderr: '', last: '' }); // biome-ignore format: one check
  const ended = lines.filter(({ outcome }) => outcome !== 'started');
  expect(ended.map(({ name }) => name)).toEqual(cases.map(([name]) => name));
  for (const { name, outcome, message } of ended) {
    expect({ name, outcome: outcome === 'fault' ? message : '' }).toEqual({ name, outcome: '' });
    if (outcome === 'refused') expect(message).toMatch(/^[^\n]{10,}/);
  }
  const slowest = [...ended].sort((a, b) => b.seconds - a.seconds).slice(0, 4);
  console.log(
    `${ended.length} cases, ${ended.filter(({ outcome }) => outcome === 'refused').length} refused, up to ${Math.round(Math.max(...ended.map(({ megabytes }) => megabytes)))} MB; slowest: ${slowest.map(({ name, seconds }) => `${name} ${seconds.toFixed(2)} s`).join(', ')}`,
  );
  return ended;
}

test('texts that must be refused are, by whichever command', () => {
  for (const { name, outcome } of run(withCommands(REFUSED, 2))) {
    expect({ name, outcome }).toEqual({ name, outcome: 'refused' });
  }
}, 300_000);

test('texts that are allowed end with an answer or a limit', () => {
  const ended = run(withCommands(ALLOWED, 4));
  for (const name of ['narrow: a program that nobody looks at', 'compare: conditions that double', 'compare: parities that double', 'build: a thousand wires']) {
    expect({ name, outcome: ended.find((one) => one.name === name)?.outcome }).toEqual({ name, outcome: 'exit 0' });
  } // biome-ignore format: one list
}, 300_000);

test('matrices, expressions and devices', () => {
  const devices = Object.entries(DEVICES).flatMap(([name, text]) =>
    (['narrow', 'build'] as const).map((command): Case => {
      const request = requestOf(command, { name: 'expression', text: 'cx', isExpression: true });
      return [`${command}: device: ${name}`, { ...request, options: { device: { name: 'd.json', text } } }]; // biome-ignore format: one case
    }),
  );
  const ended = run([
    ...withCommands(MATRICES, 2),
    ...withCommands(EXPRESSIONS, 2, { isExpression: true }),
    ...devices,
  ]);
  for (const { name, outcome } of ended) {
    if (/a huge size|deep (brackets|lists)|a module|wrong|a text|products of/.test(name)) {
      expect({ name, outcome }).toEqual({ name, outcome: 'refused' });
    }
  }
}, 300_000);

const SAMPLE = `OPENQASM 3.0;
include "stdgates.inc";
gate pair(t) w, v { h w; ctrl @ rx(t / 2) w, v; gphase(t); }
qubit[3] q;
bit[3] c;
const int n = 2;
let half = q[0:1];
for int i in [0:n - 1] { pair(pi / 4) q[i], q[i + 1]; }
pow(0.5) @ pair(1) q[0], q[1];
@wiregauge.leaves 0
c[0] = measure q[0];
reset q[0];
if (c[0] && !c[1] || c == 5) { x q[1]; c[1] = measure q[1]; z q[2]; } else { y q[2]; }
c[2] = c[0] ^ c[1];
measure q -> c;
`;

/** A text cut off, with bytes exchanged, or of bytes alone; a word of another place put in. */
function spoilt(draw: Random): string {
  const below = (n: number): number => Math.floor(draw() * n);
  const words = SAMPLE.split(/(?<=[\s;,()[\]{}])/);
  switch (below(4)) {
    case 0:
      return SAMPLE.slice(0, below(SAMPLE.length));
    case 1: {
      const bytes = new TextEncoder().encode(SAMPLE);
      for (let k = 0; k < 3; k++) bytes[below(bytes.length)] = below(256);
      return new TextDecoder().decode(bytes);
    }
    case 2:
      return new TextDecoder().decode(Uint8Array.from({ length: below(400) }, () => below(256)));
    default: {
      const at = below(words.length);
      return [
        ...words.slice(0, at),
        words[below(words.length)]!,
        ...words.slice(at + below(3)),
      ].join('');
    }
  }
}

test('a good text cut off at every word, and 400 spoilt ones (seed 88)', () => {
  const draw = random(88);
  const words = SAMPLE.split(/(?<=[\s;,()[\]{}])/);
  const cut = words.map((_, k): Case => {
    const text = words.slice(0, k).join('');
    return [`cut at word ${k}`, requestOf('compare', { name: 'cut.qasm', text })];
  });
  const others = Array.from({ length: 400 }, (_, k): Case => {
    const text = spoilt(draw);
    const command = COMMANDS[k % 4]!;
    return [`${command}: spoilt ${k}`, requestOf(command, { name: 'spoilt.qasm', text })];
  });
  const ended = run([...cut, ...others]);
  expect(ended.some(({ outcome }) => outcome === 'exit 0')).toBe(true);
}, 300_000);
