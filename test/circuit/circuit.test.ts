import { describe, expect, test } from 'vitest';
import {
  bitName,
  bitsOf,
  type Circuit,
  emptyCircuit,
  evaluateBits,
  type GateOperation,
  gate,
  type Operation,
  unitaryGate,
  wireName,
} from '../../src/circuit/circuit.ts';
import { countCircuit } from '../../src/circuit/counts.ts';
import { gateTable } from '../../src/circuit/gates.ts';
import { dependencyGraph } from '../../src/circuit/graph.ts';
import { applyGateInto, circuitUnitary, gateMatrix } from '../../src/circuit/unitary.ts';
import { InputError } from '../../src/input-error.ts';
import { identity, kron, mul } from '../../src/numeric/complex-matrix.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

const circuitOf = (wires: number, operations: Operation[], bits = 0): Circuit => ({
  ...emptyCircuit(wires, bits),
  operations,
});
const difference = (a: Float64Array, b: Float64Array): number =>
  a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);

/** A random gate of the table with random controls and power on random wires. */
function randomGate(n: number, draw: Random): GateOperation {
  const names = [...gateTable.values()].filter((entry) => entry.wires <= n);
  const entry = names[Math.floor(draw() * names.length)]!;
  const controlCount = Math.min(n - entry.wires, Math.floor(draw() * 3));
  const wires = Array.from({ length: n }, (_, k) => k)
    .sort(() => draw() - 0.5)
    .slice(0, entry.wires + controlCount);
  return {
    ...gate(entry.name, wires, ...Array.from({ length: entry.angles }, () => 6 * (draw() - 0.5))),
    controls: Array.from({ length: controlCount }, () => draw() < 0.5),
    power: draw() < 0.7 ? 1 : [2, -1, 0.5, -0.3][Math.floor(draw() * 4)]!,
  };
}

/** The operation on all n wires, entry by entry from its own small matrix: the definition, spelt out. */
function spreadOut(operation: GateOperation, n: number): Float64Array {
  const small = gateMatrix(operation);
  const k = operation.wires.length;
  const d = 2 ** n;
  const out = new Float64Array(2 * d * d);
  const local = (index: number): number =>
    operation.wires.reduce((sum, w, j) => sum + (((index >> (n - 1 - w)) & 1) << (k - 1 - j)), 0);
  const others = operation.wires.reduce((mask, w) => mask & ~(1 << (n - 1 - w)), d - 1);
  for (let i = 0; i < d; i++) {
    for (let j = 0; j < d; j++) {
      if ((i & others) !== (j & others)) continue;
      const at = local(i) * 2 ** k + local(j);
      out[i * d + j] = small[at]!;
      out[d * d + i * d + j] = small[4 ** k + at]!;
    }
  }
  return out;
}

describe('applying gates', () => {
  test.each([1, 2, 3, 4, 5])('%i wires: the fast road equals the definition (seed 31)', (n) => {
    const draw = random(31, n);
    const d = 2 ** n;
    for (let round = 0; round < 60; round++) {
      const operation = randomGate(n, draw);
      const start = haarUnitary(d, draw);
      const expected = mul(spreadOut(operation, n), start, d);
      const actual = applyGateInto(start.slice(), operation, n, d);
      expect(difference(actual, expected)).toBeLessThan(1e-13);
    }
  });

  test('controls are outermost first: negctrl @ ctrl @ u', () => {
    const u = haarUnitary(2, random(32));
    const operation = { ...unitaryGate(u, [0, 1, 2]), controls: [false, true] };
    const matrix = gateMatrix(operation);
    const expected = identity(8);
    for (const [i, j] of [[0, 0], [0, 1], [1, 0], [1, 1]] as const) {
      expected[(2 + i) * 8 + 2 + j] = u[2 * i + j]!;
      expected[64 + (2 + i) * 8 + 2 + j] = u[4 + 2 * i + j]!;
    } // biome-ignore format: four entries
    expect(difference(matrix, expected)).toBe(0);
  });

  test('wire 0 is the most significant bit', () => {
    const { matrix } = gateTable.get('x')!;
    const u = circuitUnitary(circuitOf(2, [gate('x', [0])]));
    expect(difference(u, kron(matrix([]), identity(2), 2, 2))).toBe(0);
  });

  test('a global phase multiplies the matrix', () => {
    const u = circuitUnitary({ ...circuitOf(1, [gate('z', [0])]), globalPhase: Math.PI / 2 });
    expect(difference(u, Float64Array.of(0, 0, 0, 0, 1, 0, 0, -1))).toBeLessThan(1e-15);
  });

  test('what is not unitary, or too large, is refused by name', () => {
    const measured = circuitOf(1, [{ kind: 'measure', wire: 0, bit: 0, line: 4, column: 2 }], 1);
    expect(() => circuitUnitary(measured)).toThrow('expected unitary gates only, got measure');
    const condition = { kind: 'bit', bit: 0 } as const;
    const conditioned = circuitOf(1, [{ ...gate('x', [0]), condition }], 1);
    expect(() => circuitUnitary(conditioned)).toThrow('got a condition');
    expect(() => circuitUnitary(circuitOf(13, []))).toThrow(InputError);
  });
});

describe('counts', () => {
  test('depth is the critical path; barriers and assignments cost nothing', () => {
    const operations: Operation[] = [
      gate('h', [0]),
      gate('cx', [0, 1]),
      { kind: 'barrier', wires: [0, 1, 2] },
      gate('rz', [2], 0.3),
      gate('ccx', [0, 1, 2]),
      { kind: 'measure', wire: 0, bit: 0 },
      { kind: 'assign', bit: 1, value: { kind: 'bit', bit: 0 } },
      { ...gate('x', [2]), condition: { kind: 'bit', bit: 1 } },
      { kind: 'reset', wire: 0 },
    ];
    expect(countCircuit(circuitOf(3, operations, 2))).toEqual({
      wires: 3,
      bits: 2,
      oneQubit: 3,
      twoQubit: 2,
      largerGates: 1,
      // h, cx, (barrier) rz, ccx, measure, x waits for the bit
      depth: 6,
      twoQubitDepth: 2,
      measurements: 1,
      resets: 1,
    });
  });

  test('an empty circuit counts nothing', () => {
    expect(countCircuit(circuitOf(2, []))).toMatchObject({ wires: 2, depth: 0, oneQubit: 0 });
  });
});

describe('dependency graph', () => {
  test('follows wires, and bits from writer to reader to next writer', () => {
    const bit = { kind: 'bit', bit: 0 } as const;
    const circuit = circuitOf(
      3,
      [
        gate('h', [0]),
        { kind: 'measure', wire: 0, bit: 0 },
        { ...gate('x', [1]), condition: bit },
        { ...gate('x', [2]), condition: bit },
        { kind: 'measure', wire: 1, bit: 0 },
        gate('cx', [0, 2]),
      ],
      1,
    );
    const { start, before } = dependencyGraph(circuit);
    const rows = Array.from({ length: 6 }, (_, k) => [...before.slice(start[k], start[k + 1])]);
    expect(rows).toEqual([[], [0], [1], [1], [1, 2, 3], [1, 3]]);
  });

  test('any order that respects it gives the same unitary (seed 33)', () => {
    const draw = random(33);
    for (let round = 0; round < 20; round++) {
      const operations = Array.from({ length: 25 }, () => randomGate(4, draw));
      const circuit = circuitOf(4, operations);
      const { start, before } = dependencyGraph(circuit);
      const done = new Set<number>();
      const order: number[] = [];
      while (order.length < operations.length) {
        const ready = operations
          .map((_, k) => k)
          .filter(
            (k) =>
              !done.has(k) && [...before.slice(start[k], start[k + 1])].every((b) => done.has(b)),
          );
        const next = ready[Math.floor(draw() * ready.length)]!;
        order.push(next);
        done.add(next);
      }
      const shuffled = circuitOf(
        4,
        order.map((k) => operations[k]!),
      );
      expect(difference(circuitUnitary(circuit), circuitUnitary(shuffled))).toBeLessThan(1e-12);
    }
  });
});

describe('bits and names', () => {
  const [a, b] = [
    { kind: 'bit', bit: 2 },
    { kind: 'bit', bit: 0 },
  ] as const;

  test('expressions are evaluated and tell which bits they read', () => {
    const expression = {
      kind: 'or',
      of: [
        { kind: 'not', of: a },
        { kind: 'xor', of: [a, b] },
      ],
    } as const;
    expect(bitsOf(expression)).toEqual([0, 2]);
    const value = (x: boolean, y: boolean): boolean =>
      evaluateBits(expression, (bit) => (bit === 2 ? x : y));
    expect([value(false, false), value(true, false), value(true, true)]).toEqual([
      true,
      true,
      false,
    ]);
  });

  test('names come from the registers', () => {
    const circuit: Circuit = {
      ...emptyCircuit(3, 1),
      qubitRegisters: [
        { name: 'weir', first: 0, size: 1, scalar: true },
        { name: 'q', first: 1, size: 2, scalar: false },
      ],
    };
    expect([0, 1, 2].map((wire) => wireName(circuit, wire))).toEqual(['weir', 'q[0]', 'q[1]']);
    expect(bitName(circuit, 0)).toBe('c[0]');
  });
});
