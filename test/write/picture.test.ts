import { describe, expect, test } from 'vitest';
import type { Circuit } from '../../src/circuit/circuit.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { frontierPicture } from '../../src/write/frontier-picture.ts';
import { circuitPicture } from '../../src/write/picture.ts';
import { angleText } from '../../src/write/picture-labels.ts';
import { layoutCircuit } from '../../src/write/picture-layout.ts';

const read = (body: string): Circuit =>
  readCircuit(`OPENQASM 3;\ninclude "stdgates.inc";\n${body}`, 'test.qasm').circuit;

const NARROWED = read(`qubit[2] q;
bit[2] out;
@wiregauge.enters 0
reset q[0];
@wiregauge.enters 2
reset q[1];
h q[0]; cx q[0], q[1]; rz(0.3) q[0]; cx q[0], q[1]; h q[1]; rz(pi/2) q[1];
@wiregauge.leaves 0
out[0] = measure q[0];
@wiregauge.enters 1
reset q[0];
cx q[0], q[1];
@wiregauge.leaves 2
out[1] = measure q[1];`);

/** Every element opened is closed, in order; attributes are quoted. A small reader of our own. */
function isWellFormed(svg: string): boolean {
  const open: string[] = [];
  const rest = svg.replace(
    /<(\/?)([a-zA-Z]+)((?: [a-zA-Z:-]+="[^"<]*")*)(\/?)>/g,
    (_, end, name, _attributes, empty) => {
      if (end) {
        if (open.pop() !== name) open.push('mismatch');
      } else if (!empty) open.push(name);
      return '';
    },
  );
  return open.length === 0 && !rest.includes('<');
}

describe('layout', () => {
  test('no two operations share a cell, and every wire keeps the order of the text', () => {
    for (let seed = 0; seed < 30; seed++) {
      let state = seed + 1;
      const draw = (n: number): number => {
        state = (state * 48271) % 2147483647;
        return state % n;
      };
      const lines = Array.from({ length: 40 }, () => {
        const a = draw(6);
        const b = (a + 1 + draw(5)) % 6;
        return ['h q[0];', `cx q[${a}], q[${b}];`, `c[${draw(3)}] = measure q[${a}];`, `if (c[${draw(3)}]) x q[${b}];`][draw(4)]; // biome-ignore format: the kinds of lines
      });
      const circuit = read(`qubit[6] q; bit[3] c;\n${lines.join('\n')}`);
      for (const classical of ['lines', 'tags'] as const) {
        const { placed, columns } = layoutCircuit(circuit, { classical });
        expect(placed).toHaveLength(circuit.operations.length);
        const taken = new Set<string>();
        const last = new Map<number, number>();
        for (const { top, bottom, column, wires } of placed) {
          expect(column).toBeLessThan(columns);
          for (let row = top; row <= bottom; row++) {
            expect(taken.has(`${row}/${column}`)).toBe(false);
            taken.add(`${row}/${column}`);
          }
          for (const wire of wires) {
            expect(column).toBeGreaterThan(last.get(wire) ?? -1);
            last.set(wire, column);
          }
        }
      }
    }
  });

  test('a condition stands to the right of the measurement that wrote its bit', () => {
    const circuit = read('qubit[2] q; bit c;\nc = measure q[0];\nif (c) x q[1];');
    for (const classical of ['lines', 'tags'] as const) {
      const [measure, gate] = layoutCircuit(circuit, { classical }).placed;
      expect(gate!.column).toBeGreaterThan(measure!.column);
    }
  });

  test('knows which qubit a wire carries, and from where to where', () => {
    const { lifespans, placed } = layoutCircuit(NARROWED);
    expect(lifespans.map(({ wire, enters, leaves }) => [wire, enters, leaves])).toEqual([
      [0, 0, 0],
      [1, 2, 2],
      [0, 1, -1],
    ]);
    const [first, , second] = lifespans;
    expect(first!.to).toBeLessThan(second!.from);
    expect(placed.filter(({ enters }) => enters !== undefined)).toHaveLength(3);
  });

  test('a dropped output ends before the reset that lets the next qubit in', () => {
    const circuit = read(
      'qubit q;\n@wiregauge.enters 0\nreset q;\nh q;\n@wiregauge.leaves 0\n@wiregauge.enters 1\nreset q;\nh q;',
    );
    const { lifespans } = layoutCircuit(circuit);
    expect(lifespans).toEqual([
      { wire: 0, enters: 0, leaves: 0, from: 0, to: 1 },
      { wire: 0, enters: 1, leaves: -1, from: 2, to: 3 },
    ]);
  });

  test('brackets long runs of gates between events, with columns of their own', () => {
    const { brackets, placed } = layoutCircuit(NARROWED);
    expect(brackets).toHaveLength(1);
    const [bracket] = brackets;
    expect(bracket!.operations).toHaveLength(6);
    const inside = new Set(bracket!.operations);
    for (const { index, column } of placed) {
      expect(column >= bracket!.from && column <= bracket!.to).toBe(inside.has(index));
    }
    expect(layoutCircuit(NARROWED, { brackets: false }).brackets).toEqual([]);
  });
});

describe('picture', () => {
  test('is well-formed and links every operation to its line and wires', () => {
    const circuit = read(
      'qubit[3] q; bit[2] c;\ncx q[0], q[2];\nccx q[0], q[1], q[2];\nswap q[0], q[1];\ncp(pi/8) q[0], q[1];\nu3(1, 2, 3) q[0];\nnegctrl @ h q[0], q[1];\nrxx(0.1) q[2], q[0];\nc[0] = measure q[0];\nif (c[0]) x q[1];\nreset q[0];\nbarrier q;'.replace('rxx(0.1)', 'cu(1,2,3,4)'), // biome-ignore format: one text
    );
    const svg = circuitPicture(circuit);
    expect(isWellFormed(svg)).toBe(true);
    circuit.operations.forEach((operation, index) => {
      expect(svg).toContain(`data-op="${index}" data-line="${operation.line}"`);
    });
    expect(svg).toContain('data-wires="0 2"');
    expect(svg).toMatch(/<title id="wg-title">Circuit test.qasm<\/title>/);
  });

  test('names what enters and what leaves, in the drawing and in its description', () => {
    const svg = circuitPicture(NARROWED, { qubitNames: ['left', 'middle', 'right'] });
    expect(svg.match(/class="flag enters"/g)).toHaveLength(3);
    expect(svg.match(/class="flag leaves"/g)).toHaveLength(2);
    expect(svg).toContain('On wire q[0], left enters and leaves as left.');
    expect(svg).toContain('On wire q[0], middle enters and stays.');
    expect(svg.match(/class="bracket"/g)).toHaveLength(1);
  });

  test('for a page it carries no style, script or style attribute', () => {
    const svg = circuitPicture(NARROWED, { standalone: false, idPrefix: 'after' });
    expect(svg).not.toMatch(/<style|<script|style=| on[a-z]+=/);
    expect(svg).toContain('id="after-title"');
  });

  test('escapes names that come from outside', () => {
    const circuit: Circuit = { ...NARROWED, name: '<img src=x onerror="alert(1)">' };
    const svg = circuitPicture(circuit, { qubitNames: ['<b>', '&', '"'] });
    expect(svg).not.toContain('<img');
    expect(svg).not.toContain('<b>');
    expect(isWellFormed(svg)).toBe(true);
  });

  test('large circuits become a few paths, and very large ones are cut and say so', () => {
    const body = Array.from({ length: 2500 }, (_, k) => `cx q[${k % 70}], q[${(k + 1) % 70}];`);
    const large = read(`qubit[70] q;\n${body.join('\n')}`);
    const svg = circuitPicture(large);
    expect(isWellFormed(svg)).toBe(true);
    expect(svg.match(/<path/g)!.length).toBeLessThan(10);
    expect(svg).toContain('70 wires, 2500 operations, drawn as strokes');
    const operations = Array.from({ length: 20_001 }, (_, k) => large.operations[k % 2500]!);
    expect(circuitPicture({ ...large, operations })).toContain('the first 20000 operations');
  });

  test('empty circuits have a picture too', () => {
    expect(isWellFormed(circuitPicture(read('qubit q;')))).toBe(true);
  });

  test('angles are multiples of pi where they are', () => {
    expect([0, Math.PI, -Math.PI / 2, (3 * Math.PI) / 4, 0.7312, -1e-4].map(angleText)).toEqual([
      '0',
      'π',
      '−π/2',
      '3π/4',
      '0.731',
      '−0.000100',
    ]);
  });
});

describe('frontier', () => {
  const points = [
    { wires: 2, depth: 18, success: 0.41 },
    { wires: 3, depth: 12, success: 0.62 },
    { wires: 4, depth: 9, success: null },
  ];

  test('is a staircase that falls from fewer wires to more, with every point in words', () => {
    const svg = frontierPicture(points, [{ wires: 4, depth: 11, success: null, label: 'a<b' }]);
    expect(isWellFormed(svg)).toBe(true);
    const heights = [...svg.matchAll(/<circle class="point" cx="([\d.]+)" cy="([\d.]+)"/g)].map(
      ([, x, y]) => [Number(x), Number(y)],
    );
    expect(heights).toHaveLength(3);
    // further right means more wires; lower on the page means less depth
    expect(heights[0]![0]).toBeLessThan(heights[2]![0]!);
    expect(heights[0]![1]).toBeLessThan(heights[2]![1]!);
    expect(svg).toContain('2 wires, depth 18, success 41 %; 3 wires, depth 12, success 62 %');
    expect(svg).toContain('a&lt;b');
  });

  test('says so when there is nothing to trade', () => {
    expect(frontierPicture([], [])).toContain('There is nothing to trade.');
  });
});
