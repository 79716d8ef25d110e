import { expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import type { Circuit } from '../../src/circuit/circuit.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const whole = (draw: Random, k: number): number => Math.min(k - 1, Math.floor(k * draw()));
const HEAD = ['OPENQASM 3;', 'include "stdgates.inc";'];

function gates(n: number, count: number, draw: Random): string[] {
  return Array.from({ length: count }, () => {
    const a = whole(draw, n);
    const b = (a + 1 + whole(draw, n - 1)) % n;
    const kind = whole(draw, 4);
    if (kind === 0) return `u3(${1 + draw()}, ${1 + draw()}, ${1 + draw()}) q[${a}];`;
    if (kind === 1) return `rx(${0.5 + draw()}) q[${a}];`;
    return kind === 2 ? `cp(${0.5 + draw()}) q[${a}], q[${b}];` : `cx q[${a}], q[${b}];`;
  });
}

/** The same gate in other words, several lines of them. */
function reworded(line: string): string[] {
  const cx = line.match(/^cx (.*), (.*);/);
  if (cx) return [`h ${cx[2]};`, `cz ${cx[1]}, ${cx[2]};`, `h ${cx[2]};`];
  const rx = line.match(/^rx\((.*)\) (.*);/);
  if (rx) return [`h ${rx[2]};`, `rz(${rx[1]}) ${rx[2]};`, `h ${rx[2]};`];
  return [line];
}

const read = (n: number, lines: readonly string[]): Circuit =>
  readCircuit([...HEAD, `qubit[${n}] q;`, ...lines].join('\n'), 'x').circuit;

test('a planted change is within both stretches, however the rest is worded, and they are short', () => {
  let total = 0;
  for (let seed = 0; seed < 60; seed++) {
    const draw = random(seed, 'where');
    const n = 3 + whole(draw, 4);
    const lines = gates(n, 40, draw);
    const at = 5 + whole(draw, 30);
    const other: string[] = [];
    let planted = 0;
    lines.forEach((line, k) => {
      if (k === at) {
        other.push(...reworded(line), `rx(0.01) q[0];`);
        planted = other.length;
      } else other.push(...(k % 3 === 0 ? reworded(line) : [line]));
    });
    const report = compareCircuits(read(n, lines), read(n, other));
    expect(report.verdict).toBe('different');
    const { original, rewritten } = report.where!;
    // three lines stand before the first gate
    expect(rewritten!.from).toBeLessThanOrEqual(planted + 3);
    expect(rewritten!.to).toBeGreaterThanOrEqual(planted + 3);
    if (original) expect(original.from).toBeLessThanOrEqual(at + 4 + 8);
    total += rewritten!.to - rewritten!.from + 1;
  }
  console.log(`stretch in the rewritten circuit: ${(total / 60).toFixed(1)} lines on average`);
  expect(total / 60).toBeLessThan(6);
});

test('a gate left out: no gate of the rewritten circuit, and one line of the original', () => {
  const draw = random(5, 'left out');
  const lines = gates(5, 60, draw);
  const at = lines.findIndex((line, k) => k > 20 && line.startsWith('u3'));
  const report = compareCircuits(read(5, lines), read(5, lines.filter((_, k) => k !== at))); // biome-ignore format: one call
  expect(report.where).toEqual({ original: { from: at + 4, to: at + 4 }, rewritten: null });
});

test('with inputs in |0> what those make equal is no difference', () => {
  const a = read(3, ['cx q[0], q[1];', 'h q[0];', 'cx q[0], q[2];', 'rx(0.3) q[2];']);
  const b = read(3, ['h q[0];', 'cx q[0], q[2];', 'rx(0.4) q[2];']);
  const { where } = compareCircuits(a, b, { contract: { inputs: 'zero' } });
  expect(where).toEqual({ original: { from: 7, to: 7 }, rewritten: { from: 6, to: 6 } });
});
