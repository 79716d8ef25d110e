import { describe, expect, test } from 'vitest';
import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  type Operation,
} from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import type { ContractOptions } from '../../src/contract.ts';
import { random } from '../../src/numeric/random.ts';
import { type NarrowedCircuit, narrowByStructure } from '../../src/plan/structure.ts';
import type { StructureRules } from '../../src/survey/early.ts';
import { outcomeGap, randomInputs, simulate } from './branch-simulation.ts';

const measure = (wire: number, bit = wire): Operation => ({ kind: 'measure', wire, bit });
const reset = (wire: number): Operation => ({ kind: 'reset', wire });

function program(wires: number, bits: number, operations: readonly Operation[]): Circuit {
  return { ...emptyCircuit(wires, bits), operations };
}

/** Narrows, simulates both on random inputs, and returns the narrowed circuit. */
function checked(
  circuit: Circuit,
  options: ContractOptions = {},
  narrowing: { wires?: number; rules?: Partial<StructureRules> } = {},
): NarrowedCircuit {
  const contract = contractOf(circuit, options);
  const narrowed = narrowByStructure(circuit, contract, narrowing);
  for (let seed = 1; seed <= 2; seed++) {
    const inputs = randomInputs(contract, seed);
    const before = simulate(circuit, inputs, contract, circuit.bits);
    const after = simulate(narrowed.circuit, inputs, contract, circuit.bits);
    expect(outcomeGap(before, after)).toBeLessThan(1e-12);
  }
  return narrowed;
}

/** Stations 0 .. n-2 send their parity to the last wire. */
function parity(n: number): Circuit {
  const operations: Operation[] = [];
  const target = n - 1;
  operations.push(gate('x', [target]), gate('h', [target]));
  for (let k = 0; k < target; k++) operations.push(gate('h', [k]));
  for (let k = 0; k < target; k++) if (k % 3 !== 1) operations.push(gate('cx', [k, target]));
  for (let k = 0; k < target; k++) operations.push(gate('h', [k]), measure(k));
  return program(n, n - 1, operations);
}

function star(n: number): Circuit {
  const operations: Operation[] = [gate('h', [0])];
  for (let k = 1; k < n; k++)
    operations.push(gate('ry', [k], 0.1 * k), gate('crx', [0, k], 0.3 * k));
  for (let k = 0; k < n; k++) operations.push(gate('h', [k]), measure(k));
  return program(n, n, operations);
}

function fourier(n: number, options: { swaps: boolean; measured: boolean }): Circuit {
  const operations: Operation[] = [];
  for (let k = 0; k < n; k++) {
    operations.push(gate('h', [k]));
    for (let j = k + 1; j < n; j++) operations.push(gate('cp', [j, k], Math.PI / 2 ** (j - k)));
  }
  if (options.swaps) {
    for (let k = 0; k < n - 1 - k; k++) operations.push(gate('swap', [k, n - 1 - k]));
  }
  if (options.measured) for (let k = 0; k < n; k++) operations.push(measure(k));
  return program(n, options.measured ? n : 0, operations);
}

describe('programs with one shared wire (common practice)', () => {
  test.each([4, 7])('parity on %i wires narrows to 2', (n) => {
    expect(checked(parity(n)).circuit.wires).toBe(2);
  });
  test.each([12, 22])('parity and star on %i wires plan to 2', (n) => {
    for (const circuit of [parity(n), star(n)]) {
      const narrowed = narrowByStructure(circuit, contractOf(circuit));
      expect(narrowed.circuit.wires).toBe(2);
      expect(narrowed.reuse.length).toBe(n - 2);
    }
  });
  test('a star narrows to 2', () => {
    expect(checked(star(6)).circuit.wires).toBe(2);
  });
  test('a parity written with barriers narrows too', () => {
    const { operations, ...rest } = parity(5);
    const all = [0, 1, 2, 3, 4];
    const withBarrier = operations.flatMap((operation): Operation[] =>
      operation.kind === 'measure' ? [{ kind: 'barrier', wires: all }, operation] : [operation],
    );
    const narrowed = checked({ ...rest, operations: withBarrier });
    expect(narrowed.circuit.wires).toBe(2);
    expect(narrowed.rules.some((rule) => rule.includes('barrier'))).toBe(true);
  });
});

describe('Fourier transform, then measurement: Griffiths, Niu, PRL 76, 3228 (1996)', () => {
  for (const n of [3, 4, 5]) {
    for (const swaps of [false, true]) {
      test(`${n} wires, final swaps ${swaps}: 1 wire, for any input and from zero`, () => {
        const circuit = fourier(n, { swaps, measured: true });
        for (const inputs of ['any', 'zero'] as const) {
          const narrowed = checked(circuit, { inputs });
          expect(narrowed.circuit.wires).toBe(1);
        }
        const { circuit: written, rules } = checked(circuit, { inputs: 'any' });
        expect(written.operations.some(({ condition }) => condition)).toBe(true);
        expect(rules.some((rule) => rule.startsWith('early measurement'))).toBe(true);
      });
    }
  }
  test('measured by the options alone: bits out[i]', () => {
    const circuit = fourier(4, { swaps: true, measured: false });
    const contract = contractOf(circuit, { inputs: 'any', outputs: 'measured' });
    const narrowed = narrowByStructure(circuit, contract);
    expect(narrowed.circuit.wires).toBe(1);
    const written = fourier(4, { swaps: true, measured: true });
    for (let seed = 1; seed <= 3; seed++) {
      const inputs = randomInputs(contract, seed);
      const before = simulate(written, inputs, contract, 4);
      const after = simulate(narrowed.circuit, inputs, contract, 4);
      expect(outcomeGap(before, after)).toBeLessThan(1e-12);
    }
  });
  test('as a block it needs every wire', () => {
    const narrowed = checked(fourier(4, { swaps: true, measured: false }));
    expect(narrowed.circuit.wires).toBe(4);
  });
  test('without early measurement it needs every wire; with room enough there are no conditions', () => {
    const circuit = fourier(4, { swaps: false, measured: true });
    const late = checked(circuit, { inputs: 'any' }, { rules: { early: false } });
    expect(late.circuit.wires).toBe(4);
    const wide = checked(circuit, { inputs: 'any' }, { wires: 4 });
    expect(wide.circuit.wires).toBe(4);
    expect(wide.circuit.operations.every(({ condition }) => !condition)).toBe(true);
    const middle = checked(circuit, { inputs: 'any' }, { wires: 2 });
    expect(middle.circuit.wires).toBe(2);
  });
});

describe('phase estimation: t bits and one eigenstate wire', () => {
  // follows from the transform above: one wire for the bits in turn, one for the eigenstate
  test.each([3, 4])('%i bits narrow to 2 wires with conditions', (t) => {
    const operations: Operation[] = [gate('h', [t])];
    for (let k = 0; k < t; k++) operations.push(gate('h', [k]));
    for (let k = 0; k < t; k++) operations.push(gate('crx', [k, t], 0.7 * 2 ** k));
    for (let k = t - 1; k >= 0; k--) {
      for (let j = t - 1; j > k; j--) operations.push(gate('cp', [j, k], -Math.PI / 2 ** (j - k)));
      operations.push(gate('h', [k]));
    }
    for (let k = 0; k < t; k++) operations.push(measure(k));
    const narrowed = checked(program(t + 1, t, operations));
    expect(narrowed.circuit.wires).toBe(2);
    expect(narrowed.circuit.operations.some(({ condition }) => condition)).toBe(true);
  });
});

describe('rules at the boundary', () => {
  test('phases before a measurement and gates on dropped wires vanish', () => {
    const operations = [
      gate('h', [0]),
      gate('cx', [0, 1]),
      gate('t', [0]),
      gate('rzz', [0, 1], 0.7),
      gate('cx', [0, 2]),
      measure(0, 0),
      measure(1, 1),
    ];
    const narrowed = checked(program(3, 2, operations), { inputs: 'any' });
    const names = narrowed.circuit.operations.flatMap((o) => (o.kind === 'gate' ? [o.name] : []));
    expect(names).toEqual(['h']);
    expect(narrowed.rules.some((rule) => rule.startsWith('no effect'))).toBe(true);
    const whole = checked(
      program(3, 2, operations),
      { inputs: 'any' },
      { rules: { dead: false, xor: false } },
    );
    expect(whole.circuit.operations.filter(({ kind }) => kind === 'gate').length).toBeGreaterThan(
      4,
    );
  });
  test('final CX gates between measured wires become assignments', () => {
    const operations = [
      gate('h', [0]),
      gate('ry', [1], 0.4),
      gate('rx', [2], 1.1),
      gate('cx', [0, 1]),
      gate('cx', [1, 2]),
      gate('ccx', [0, 2, 1]),
      gate('x', [0]),
      measure(0),
      measure(1),
      measure(2),
    ];
    const narrowed = checked(program(3, 3, operations), { inputs: 'any' });
    expect(narrowed.circuit.wires).toBe(1);
    expect(narrowed.circuit.operations.filter(({ kind }) => kind === 'assign').length).toBe(4);
    expect(checked(program(3, 3, operations), {}, { rules: { xor: false } }).circuit.wires).toBe(3);
  });
  test('a bit that a condition reads is never assigned', () => {
    const operations: Operation[] = [
      gate('h', [0]),
      gate('h', [1]),
      gate('cx', [0, 1]),
      measure(1, 0),
      { ...gate('x', [2]), condition: { kind: 'bit', bit: 0 } },
      measure(0, 1),
      measure(2, 2),
    ];
    const narrowed = checked(program(3, 3, operations));
    expect(narrowed.circuit.operations.some(({ kind }) => kind === 'assign')).toBe(false);
  });
  test('controls on |0> and on |1> are known', () => {
    const operations = [
      gate('x', [1]),
      gate('cx', [0, 2]),
      gate('ccx', [1, 2, 3]),
      gate('h', [3]),
      gate('crz', [1, 3], 0.3),
      gate('h', [3]),
      measure(3, 0),
    ];
    const narrowed = checked(program(4, 1, operations));
    expect(narrowed.circuit.wires).toBe(1);
    expect(narrowed.rules.some((rule) => rule.startsWith('start in |0>'))).toBe(true);
  });
});

describe('programs that measure, reset and decide on the way', () => {
  test('wires on which nothing happens and at which nobody looks are left out', () => {
    const narrowed = checked(
      program(5, 1, [gate('h', [3]), gate('crx', [3, 1], 0.4), measure(1, 0)]),
    );
    expect(narrowed.circuit.operations.filter(({ kind }) => kind === 'reset').length).toBe(2);
  });
  test('a flip under a condition leaves the value unknown', () => {
    const operations: Operation[] = [
      gate('h', [0]),
      measure(0, 0),
      { ...gate('x', [1]), condition: { kind: 'bit', bit: 0 } },
      gate('crx', [1, 2], 1.2),
      measure(2, 1),
    ];
    checked(program(3, 2, operations));
  });
  test('a wire that is reset twice can be three wires or one', () => {
    const operations: Operation[] = [];
    for (let round = 0; round < 3; round++) {
      operations.push(
        gate('cx', [0, 1]),
        gate('rx', [0], 0.3 + round),
        measure(1, round),
        reset(1),
      );
    }
    operations.push(gate('h', [0]), measure(0, 3));
    const circuit = program(2, 4, operations);
    expect(checked(circuit).circuit.wires).toBe(2);
    expect(checked(circuit, {}, { wires: 3 }).circuit.wires).toBe(3);
  });
  test('a teleported state arrives through its conditions', () => {
    const operations: Operation[] = [
      gate('h', [1]),
      gate('cx', [1, 2]),
      gate('cx', [0, 1]),
      gate('h', [0]),
      measure(0, 0),
      measure(1, 1),
      { ...gate('x', [2]), condition: { kind: 'bit', bit: 1 } },
      { ...gate('z', [2]), condition: { kind: 'bit', bit: 0 } },
    ];
    const circuit = program(3, 2, operations);
    const inputOf = new Map([[0, 'any']] as const);
    const outputOf = new Map([[2, 'kept']] as const);
    const narrowed = checked(circuit, { inputOf, outputOf });
    expect(narrowed.circuit.wires).toBeLessThanOrEqual(3);
  });
});

describe('random circuits keep their meaning', () => {
  const names = ['h', 't', 'cx', 'cz', 'cp', 'rzz', 'rxx', 'swap', 'ccx', 'sx', 'crx', 'cswap'];
  const one = new Set(['h', 't', 'sx']);
  const angled = new Set(['cp', 'rzz', 'rxx', 'crx']);
  function randomGate(n: number, draw: () => number): GateOperation {
    const name = names[Math.floor(draw() * names.length)]!;
    const count = one.has(name) ? 1 : name === 'ccx' || name === 'cswap' ? 3 : 2;
    const wires = Array.from({ length: n }, (_, k) => k)
      .map((k) => [draw(), k] as const)
      .sort((a, b) => a[0] - b[0])
      .slice(0, count)
      .map(([, k]) => k);
    return gate(name, wires, ...(angled.has(name) ? [draw() * 3] : []));
  }
  test.each([1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12])('seed %i', (seed) => {
    const draw = random('narrow', seed);
    const n = 4;
    const gates = Array.from({ length: 7 + (seed % 5) }, () => randomGate(n, draw));
    const ends: Operation[] = [];
    for (let k = 0; k < n; k++) if (draw() < 0.7) ends.push(measure(k));
    const circuit = program(n, n, [...gates, ...ends]);
    checked(circuit);
    checked(circuit, { inputs: 'any' });
    checked(circuit, { inputs: 'any', outputs: 'kept' });
    checked(circuit, { inputs: 'any' }, { wires: n });
    checked(program(n, 0, gates));
  });
});
