import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { compareGateByGate } from '../../src/check/gate-by-gate.ts';
import { bitPairs } from '../../src/check/observation.ts';
import { sidesOf } from '../../src/check/sides.ts';
import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
} from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import type { ContractOptions } from '../../src/contract.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { narrowByStructure } from '../../src/plan/structure.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { writeCircuit } from '../../src/write/openqasm.ts';

const measure = (wire: number, bit: number): Operation => ({ kind: 'measure', wire, bit });
const whole = (draw: Random, k: number): number => Math.min(k - 1, Math.floor(k * draw()));

/** Parity checks, rotations and controls along a valley, then measured: narrows far by structure. */
function valley(wires: number, gates: number, seed: number, isMeasured = true): Circuit {
  const draw = random(seed, 'valley');
  const operations: Operation[] = [];
  for (let w = 0; w < wires; w++) operations.push(gate('ry', [w], draw()));
  for (let k = 0; k < gates; k++) {
    const a = whole(draw, wires - 1);
    const b = Math.min(wires - 1, a + 1 + whole(draw, 2));
    const kind = whole(draw, 5);
    if (kind === 0) operations.push(gate('cx', [a, b]));
    else if (kind === 1) operations.push(gate('cp', [a, b], draw()));
    else if (kind === 2) operations.push(gate('rz', [a], draw()));
    else if (kind === 3) operations.push(gate('h', [b]));
    else operations.push(gate('rzz', [a, b], draw()));
  }
  if (isMeasured) for (let w = 0; w < wires; w++) operations.push(measure(w, w));
  return { ...emptyCircuit(wires, isMeasured ? wires : 0), operations };
}

function narrowed(circuit: Circuit, options: ContractOptions = {}): Circuit {
  const { circuit: slim } = narrowByStructure(circuit, contractOf(circuit, options), {});
  return readCircuit(writeCircuit(slim), 'narrowed.qasm').circuit;
}

const proof = (a: Circuit, b: Circuit, options: ContractOptions = {}) => {
  const sides = sidesOf(a, b, contractOf(a, options), bitPairs(a, b));
  return sides && compareGateByGate(sides);
};

/** One small wrong done to a gate, a condition or an order. */
function mutated({ operations, ...rest }: Circuit, draw: Random): Circuit | null {
  const list = [...operations];
  const k = whole(draw, list.length);
  const operation = list[k]!;
  switch (whole(draw, 4)) {
    case 0:
      if (operation.kind !== 'gate' || operation.angles.length === 0) return null;
      list[k] = { ...operation, angles: operation.angles.map((x) => x + 0.01) };
      break;
    case 1:
      if (operation.kind !== 'gate') return null;
      list.splice(k, 1);
      break;
    case 2:
      if (!operation.condition) return null;
      list[k] = { ...operation, condition: { kind: 'not', of: operation.condition } };
      break;
    default:
      if (operation.kind !== 'gate' || operation.wires.length < 2) return null;
      list[k] = { ...operation, wires: [...operation.wires].reverse() };
  }
  return { ...rest, operations: list };
}

describe('what is the same is proved', () => {
  test.each([
    [30, 60],
    [60, 150],
    [100, 300],
  ])('programs of %i wires narrowed by structure', (wires, gates) => {
    let proved = 0;
    for (let seed = 0; seed < 4; seed++) {
      const original = valley(wires, gates, seed);
      const report = compareCircuits(original, narrowed(original));
      if (report.verdict === 'same') {
        expect(report).toMatchObject({ proof: true, method: 'gate by gate' });
        expect(report.distance!.hilbertSchmidt).toBeLessThan(1e-20);
        proved++;
      } else expect(report.verdict).toBe('undecided');
    }
    expect(proved).toBeGreaterThanOrEqual(3);
  });

  test('60 wires of CX and rotations that differ by commuting rewrites', () => {
    const draw = random(5, 'commuting');
    const original = valley(60, 400, 77, false);
    const operations = [...original.operations] as GateOperation[];
    for (let round = 0; round < 4000; round++) {
      const k = whole(draw, operations.length - 1);
      const [a, b] = [operations[k]!, operations[k + 1]!];
      const isDiagonal = ({ name }: GateOperation): boolean => ['rz', 'rzz', 'cp'].includes(name);
      const areApart = !a.wires.some((w) => b.wires.includes(w));
      if (areApart || (isDiagonal(a) && isDiagonal(b))) [operations[k], operations[k + 1]] = [b, a];
    }
    const report = compareCircuits(original, { ...original, operations });
    expect(report).toMatchObject({ verdict: 'same', proof: true, method: 'gate by gate' });
  });

  test('a local rewriting of a few gates is found again as their product', () => {
    const original = valley(40, 100, 3, false);
    // H X H = Z on one wire, in the middle
    const middle = original.operations.length / 2;
    const z = gate('z', [7]);
    const hxh = [gate('h', [7]), gate('x', [7]), gate('h', [7])];
    const at = (list: Operation[]): Circuit => ({
      ...original,
      operations: [
        ...original.operations.slice(0, middle),
        ...list,
        ...original.operations.slice(middle),
      ],
    });
    expect(proof(at([z]), at(hxh))).not.toBeNull();
    expect(proof(at([z]), at(hxh.slice(1)))).toBeNull();
  });

  test('an XOR of bits stands for a last CX', () => {
    const text = (body: string): Circuit =>
      readCircuit(`OPENQASM 3;\ninclude "stdgates.inc";\nqubit[2] q; bit[2] c;\nh q[0]; ry(1) q[1];\n${body}`, 'x').circuit; // biome-ignore format: one text
    const cx = text('cx q[0], q[1];\nc = measure q;');
    const xor = text(
      '@wiregauge.leaves 0\nc[0] = measure q[0];\n@wiregauge.leaves 1\nc[1] = measure q[1];\nc[1] = c[0] ^ c[1];',
    );
    expect(compareCircuits(cx, xor).verdict).toBe('same');
  });
});

test('where two circuits part: one angle off by 1e-6 among 300 gates on ten wires', () => {
  const lines = ['OPENQASM 3;', 'include "stdgates.inc";', 'qubit[10] q;'];
  const draw = random(13, 'where');
  for (let k = 0; k < 150; k++) {
    const a = whole(draw, 10);
    lines.push(`ry(${draw()}) q[${a}];`, `cx q[${a}], q[${(a + 1 + whole(draw, 9)) % 10}];`);
  }
  const at = 101;
  const off = lines.map((line, k) => (k === at ? line.replace('ry(', 'ry(0.000001 + ') : line));
  const read = (text: string[]): Circuit => readCircuit(text.join('\n'), 'x').circuit;
  // D = 1 - cos(5e-7) = 1.25e-13, to three digits
  const report = compareCircuits(read(lines), read(off), { tolerance: 1e-16 });
  const line = lines[at]!.startsWith('ry') ? at + 1 : at;
  if (lines[at]!.startsWith('ry')) {
    expect(report.distance!.hilbertSchmidt / 1.25e-13).toBeCloseTo(1, 3);
    expect(report.where).toEqual({ original: { from: line, to: line }, rewritten: { from: line, to: line } }); // biome-ignore format: one check
  } else throw new Error('the line to spoil must be a rotation');
});

describe('nothing is proved that is wrong', () => {
  test('small circuits: whenever this road says same, the dense one does', () => {
    let proofs = 0;
    let refused = 0;
    for (let seed = 0; seed < 400; seed++) {
      const draw = random(seed, 'mutants');
      const isMeasured = seed % 2 === 0;
      const original = valley(4, 10, seed, isMeasured);
      const options: ContractOptions = seed % 4 < 2 ? {} : { inputs: 'any' };
      const slim = narrowed(original, options);
      for (const other of [slim, mutated(slim, draw), mutated(slim, draw), mutated(slim, draw)]) {
        if (!other || !proof(original, other, options)) {
          refused++;
          continue;
        }
        proofs++;
        const dense = compareCircuits(original, other, { contract: options });
        if (dense.verdict !== 'same') throw new Error(`seed ${seed}: proved, but D = ${dense.distance?.hilbertSchmidt}`); // biome-ignore format: one sentence
      }
    }
    expect(proofs).toBeGreaterThan(300);
    expect(refused).toBeGreaterThan(300);
  });

  test('large mutants are never proved unless the change is invisible', () => {
    const original = valley(40, 120, 11);
    const slim = narrowed(original);
    expect(proof(original, slim)).not.toBeNull();
    // deleting or turning a gate that every observer sees: an H in the middle
    const seen = slim.operations.findIndex((o) => o.kind === 'gate' && o.name === 'ry');
    const without = slim.operations.filter((_, k) => k !== seen);
    expect(proof(original, { ...slim, operations: without })).toBeNull();
    const conditioned = slim.operations.findIndex((o) => o.kind === 'gate' && o.condition !== undefined && o.name !== 'p'); // biome-ignore format: one search
    if (conditioned >= 0) {
      const flipped = slim.operations.map((o, k): Operation => (k === conditioned ? { ...o, condition: { kind: 'not', of: o.condition! } } : o)); // biome-ignore format: one change
      expect(proof(original, { ...slim, operations: flipped })).toBeNull();
    }
  });

  test('a kept output whose outcome decides something is not for this road', () => {
    const text = `OPENQASM 3;\ninclude "stdgates.inc";\nqubit[2] q; bit[2] out;
@wiregauge.enters 0\nreset q[0];\n@wiregauge.leaves 0\nout[0] = measure q[0];
@wiregauge.enters 1\nreset q[1];\nif (out[0]) { x q[1]; }\n@wiregauge.leaves 1\nout[1] = measure q[1];\n`;
    const original = { ...emptyCircuit(2), operations: [gate('cx', [0, 1])] };
    expect(proof(original, readCircuit(text, 'read.qasm').circuit)).toBeNull();
  });
});
