import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import {
  type Circuit,
  circuitOfUnitary,
  emptyCircuit,
  gate,
  type Operation,
} from '../../src/circuit/circuit.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { mul } from '../../src/numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../../src/numeric/distance.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const read = (text: string, name = 'valley.qasm'): Circuit =>
  readCircuit(`OPENQASM 3;\ninclude "stdgates.inc";\n${text}`, name).circuit;

/** Fourier transform on n wires gate by gate, without reversal, and what the measured bits are called. */
function fourier(n: number, isMeasured: boolean): string {
  const lines = [`qubit[${n}] q;`, ...(isMeasured ? [`bit[${n}] c;`] : [])];
  for (let i = 0; i < n; i++) {
    lines.push(`h q[${i}];`);
    for (let j = i + 1; j < n; j++) lines.push(`cp(pi/${2 ** (j - i)}) q[${j}], q[${i}];`);
  }
  if (isMeasured) for (let i = 0; i < n; i++) lines.push(`c[${n - 1 - i}] = measure q[${i}];`);
  return lines.join('\n');
}

/** The one-wire form with conditions: Griffiths, Niu, PRL 76, 3228 (1996), outputs in the order 0, 1, ... */
function semiclassicalFourier(n: number, spoil?: (line: string) => string): string {
  const lines = [`qubit[1] q;`, `bit[${n}] c;`];
  for (let i = n - 1; i >= 0; i--) {
    const step = [`@wiregauge.enters ${i}`, 'reset q[0];'];
    for (let j = n - 1; j > i; j--) {
      step.push(`if (c[${n - 1 - j}]) { p(pi/${2 ** (j - i)}) q[0]; }`);
    }
    step.push('h q[0];', `@wiregauge.leaves ${i}`, `c[${n - 1 - i}] = measure q[0];`);
    lines.push(...step);
  }
  return lines.map((line) => spoil?.(line) ?? line).join('\n');
}

/** The Fourier transform written the other way round, so that later wires are done first. */
function fourierLastFirst(n: number): string {
  const lines = [`qubit[${n}] q;`, `bit[${n}] c;`];
  for (let i = n - 1; i >= 0; i--) {
    for (let j = n - 1; j > i; j--) lines.push(`cp(pi/${2 ** (j - i)}) q[${j}], q[${i}];`);
    lines.push(`h q[${i}];`);
  }
  for (let i = 0; i < n; i++) lines.push(`c[${n - 1 - i}] = measure q[${i}];`);
  return lines.join('\n');
}

describe('blocks', () => {
  test('published identities are the same, up to the phase', () => {
    // textbook: H X H = Z; SWAP = 3 CX; CX reversed by H; sx sx = x; Toffoli in 6 CX (Nielsen, Chuang, figure 4.9)
    const pairs: [string, string][] = [
      ['qubit q; h q; x q; h q;', 'qubit q; z q;'],
      ['qubit[2] q; swap q[0], q[1];', 'qubit[2] q; cx q[0], q[1]; cx q[1], q[0]; cx q[0], q[1];'],
      ['qubit[2] q; cx q[0], q[1];', 'qubit[2] q; h q; cx q[1], q[0]; h q;'],
      ['qubit q; sx q; sx q;', 'qubit q; rx(pi) q;'],
      [
        'qubit[3] q; ccx q[0], q[1], q[2];',
        `qubit[3] q; h q[2]; cx q[1], q[2]; tdg q[2]; cx q[0], q[2]; t q[2]; cx q[1], q[2]; tdg q[2];
         cx q[0], q[2]; t q[1]; t q[2]; h q[2]; cx q[0], q[1]; t q[0]; tdg q[1]; cx q[0], q[1];`,
      ],
    ];
    for (const [a, b] of pairs) {
      const report = compareCircuits(read(a), read(b));
      expect(report.verdict).toBe('same');
      expect(report.distance!.hilbertSchmidt).toBeLessThan(1e-29);
      expect(report.proof).toBe(true);
    }
    const phase = compareCircuits(read(pairs[3]![0]), read(pairs[3]![1])).phase;
    expect(phase).toBeCloseTo(-Math.PI / 2, 12);
  });

  test.each([1, 2, 3, 4])('%i wires: the distance is that of the matrices', (n) => {
    const draw = random(n, 'pairs');
    const d = 2 ** n;
    const u = haarUnitary(d, draw);
    const v = haarUnitary(d, draw);
    const report = compareCircuits(circuitOfUnitary(u, n, 'u'), circuitOfUnitary(v, n, 'v'));
    expect(report.distance!.hilbertSchmidt).toBeCloseTo(hilbertSchmidtDistance(u, v).distance, 12);
    expect(report.verdict).toBe('different');
    const { probabilityOriginal: p, probabilityRewritten: q } = report.witness!;
    expect(Math.abs(p - q)).toBeGreaterThan(1e-3);
  });

  test('worst case: published values for rotations', () => {
    // diamond distance of exp(-i a Z/2) from the identity is 2 sin(a/2): known-values, half of it here
    for (const a of [1e-9, 1e-3, 0.5, 2]) {
      const report = compareCircuits(read('qubit q;'), read(`qubit q; rz(${a}) q;`));
      expect(report.distance!.worstCase! / Math.sin(a / 2)).toBeCloseTo(1, 6);
    }
    const x = compareCircuits(read('qubit q;'), read('qubit q; x q;'));
    expect(x.distance!.worstCase).toBe(1);
  });

  test('an angle off by 1e-3 is different, and an independent simulation confirms the witness', () => {
    const gates = 'qubit[3] q; h q[0]; cx q[0], q[1]; rz(0.4) q[1]; cx q[1], q[2]; ry(1.1) q[2];';
    const report = compareCircuits(read(gates), read(gates.replace('0.4', '0.401')));
    expect(report.verdict).toBe('different');
    // D = 1 - cos(5e-4) for a rotation off by 1e-3
    expect(report.distance!.hilbertSchmidt).toBeCloseTo(1 - Math.cos(5e-4), 14);
    const { input, output, probabilityOriginal, probabilityRewritten } = report.witness!;
    const confirmed = [gates, gates.replace('0.4', '0.401')].map((text) =>
      probabilityOf(circuitUnitary(read(text)), 3, input, output),
    );
    expect(confirmed[0]).toBeCloseTo(probabilityOriginal, 12);
    expect(confirmed[1]).toBeCloseTo(probabilityRewritten, 12);
    expect(Math.abs(probabilityOriginal - probabilityRewritten)).toBeGreaterThan(1e-4);
  });

  test('relabelled outputs are found', () => {
    const u = haarUnitary(16, random(5));
    const permuted: Operation[] = [gate('swap', [0, 2]), gate('swap', [2, 3])];
    const original = circuitOfUnitary(u, 4, 'u');
    const rewritten = { ...original, operations: [...original.operations, ...permuted] };
    expect(compareCircuits(original, rewritten).verdict).toBe('different');
    const report = compareCircuits(original, rewritten, { relabel: true });
    expect(report.verdict).toBe('same');
    expect(report.relabelling).toEqual([3, 1, 0, 2]);
  });
});

/** Probability of an output string such as `q[0]:Z=0 q[1]:X=1` for a product input, by plain matrix arithmetic. */
function probabilityOf(u: Float64Array, n: number, input: string, output: string): number {
  const d = 2 ** n;
  const states: { [name: string]: [number, number][] } = {
    '0': [[1, 0], [0, 0]],
    '1': [[0, 0], [1, 0]],
    '+': [[Math.SQRT1_2, 0], [Math.SQRT1_2, 0]],
    '+i': [[Math.SQRT1_2, 0], [0, Math.SQRT1_2]],
  }; // biome-ignore format: amplitudes
  const wires = input.split(' ').map((part) => states[part.split('=')[1]!]!);
  let vector = new Float64Array(2 * d);
  for (let k = 0; k < d; k++) {
    let [x, y] = [1, 0];
    wires.forEach((state, w) => {
      const [a, b] = state[(k >> (n - 1 - w)) & 1]!;
      [x, y] = [x * a - y * b, x * b + y * a];
    });
    vector[k] = x;
    vector[d + k] = y;
  }
  vector = Float64Array.from(mul(u, vector, d, d, 1));
  const turns: Operation[] = [];
  const wanted = new Map<number, string>();
  for (const part of output.split(' ')) {
    const [, wire, basis, value] = /^q\[(\d+)\]:([XYZ])=([01])$/.exec(part)!;
    if (basis === 'Y') turns.push(gate('sdg', [Number(wire)]));
    if (basis !== 'Z') turns.push(gate('h', [Number(wire)]));
    wanted.set(Number(wire), value!);
  }
  const turned = mul(circuitUnitary({ ...emptyCircuit(n), operations: turns }), vector, d, d, 1);
  let p = 0;
  for (let k = 0; k < d; k++) {
    const fits = [...wanted].every(([w, value]) => String((k >> (n - 1 - w)) & 1) === value);
    if (fits) p += turned[k]! ** 2 + turned[d + k]! ** 2;
  }
  return p;
}

describe('programs and measured outputs', () => {
  test.each([2, 3, 4, 5])('Fourier on %i wires: one wire with conditions, for any input', (n) => {
    const original = read(fourierLastFirst(n));
    const narrow = read(semiclassicalFourier(n), 'narrow.qasm');
    for (const inputs of ['any', 'zero'] as const) {
      const report = compareCircuits(original, narrow, { contract: { inputs } });
      expect(report.verdict).toBe('same');
      expect(report.distance!.hilbertSchmidt).toBeLessThan(1e-28);
      expect(report.unfoldedWires).toBe(n);
    }
    const program = compareCircuits(original, narrow);
    expect(program.contract).toBe('program');
    expect(program.verdict).toBe('same');
  });

  test('every corruption of a narrowed circuit is caught', () => {
    const n = 3;
    const original = read(fourierLastFirst(n));
    const spoils: ((line: string) => string)[] = [
      (line) => line.replace('p(pi/2)', 'p(pi/2 + 0.001)'),
      (line) => line.replace('if (c[0])', 'if (!c[0])'),
      (line) => line.replace('if (c[1])', 'if (c[0])'),
      (line) => (line === 'h q[0];' ? 'h q[0]; z q[0]; h q[0];' : line),
      (line) => line.replace('c[2] = measure', 'c[1] = measure'),
    ];
    for (const spoil of spoils) {
      const spoiled = read(semiclassicalFourier(n, spoil), 'spoiled.qasm');
      const report = compareCircuits(original, spoiled, { contract: { inputs: 'any' } });
      expect(report.verdict).toBe('different');
      expect(report.witness).not.toBeNull();
    }
  });

  test('phases before a measurement do not count, before a kept output they do', () => {
    const a = read('qubit[2] q; h q[0]; cx q[0], q[1];');
    const b = read('qubit[2] q; h q[0]; cx q[0], q[1]; t q[0]; cz q[0], q[1];');
    expect(compareCircuits(a, b, { contract: { outputs: 'measured' } }).verdict).toBe('same');
    expect(compareCircuits(a, b).verdict).toBe('different');
  });

  test('a dropped output may be anything', () => {
    const a = read('qubit[2] q; bit c; h q[0]; cx q[0], q[1]; c = measure q[1];');
    const b = read('qubit[2] q; bit c; h q[1]; x q[0]; c = measure q[1];');
    expect(compareCircuits(a, b).verdict).toBe('same');
    const c = read('qubit[2] q; bit c; ry(1) q[1]; c = measure q[1];');
    const report = compareCircuits(a, c);
    expect(report.verdict).toBe('different');
    expect(report.witness).toMatchObject({ input: 'all wires in |0>' });
  });

  test('measured, used again, and reset: parity on two wires', () => {
    const wide = `qubit[4] q; bit[4] c; h q[0]; h q[1]; h q[2]; cx q[0], q[3]; cx q[1], q[3]; cx q[2], q[3];
      h q[0]; h q[1]; h q[2]; c = measure q;`;
    const slim = `qubit[2] q; bit[4] c; h q[0]; cx q[0], q[1]; h q[0]; c[0] = measure q[0]; reset q[0];
      h q[0]; cx q[0], q[1]; h q[0]; c[1] = measure q[0]; reset q[0];
      h q[0]; cx q[0], q[1]; h q[0]; c[2] = measure q[0]; c[3] = measure q[1];`;
    expect(compareCircuits(read(wide), read(slim)).verdict).toBe('same');
    const wrong = slim.replace('c[1] = measure q[0]; reset q[0];', 'c[1] = measure q[0];');
    expect(compareCircuits(read(wide), read(wrong)).verdict).toBe('different');
  });

  test('active reset by a condition, and an XOR of bits', () => {
    const a = read(
      'qubit[2] q; bit[2] c; h q[0]; c[0] = measure q[0]; reset q[0]; h q[0]; c[1] = measure q[0];',
    );
    const b = read(
      'qubit[2] q; bit[2] c; h q[0]; c[0] = measure q[0]; if (c[0]) { x q[0]; } h q[0]; c[1] = measure q[0];',
    );
    expect(compareCircuits(a, b).verdict).toBe('same');
    const x = read('qubit[2] q; bit[2] c; h q; cx q[0], q[1]; c = measure q;');
    const y = read('qubit[2] q; bit[2] c; h q; c = measure q; c[1] = c[0] ^ c[1];');
    expect(compareCircuits(x, y).verdict).toBe('same');
  });
});

test('what cannot be matched is said in one sentence', () => {
  const block = read('qubit[3] q; cx q[0], q[1];');
  expect(() => compareCircuits(block, read('qubit[2] q;'))).toThrow(/expected 3 wires/);
  const program = read(`${fourier(2, true)}`);
  expect(() => compareCircuits(program, read('qubit[2] q; bit b; b = measure q[0];'))).toThrow(
    /missing bit c\[1\]/,
  );
});
