import { describe, expect, test } from 'vitest';
import { contractOf } from '../../src/circuit/contract.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { narrowByStructure } from '../../src/plan/structure.ts';
import { planStructure } from '../../src/plan/structure-plan.ts';
import { planWindows } from '../../src/plan/windows.ts';
import { influenceFloor, influenceTables } from '../../src/survey/influence.ts';
import { relationFromTable } from '../../src/survey/relation.ts';
import { planWidth } from '../../src/survey/width.ts';
import { outcomeGap, randomInputs, simulate } from './branch-simulation.ts';
import { tripleLayer, WRITTEN } from './written-circuits.ts';

const known = new Map<string, number>();

function denseWidth(circuit: (typeof WRITTEN)[number]): number {
  const n = circuit.wires;
  let width = known.get(circuit.name);
  if (width === undefined) {
    const { kept } = influenceTables(circuitUnitary(circuit), n);
    width = planWidth(relationFromTable(kept, n, influenceFloor(n))).width;
    known.set(circuit.name, width);
  }
  return width;
}

describe('circuits written gate by gate', () => {
  const small = WRITTEN.filter(({ wires }) => wires <= 9);
  test.each(small.map((circuit) => [circuit.name, circuit] as const))(
    '%s: commutation and windows never claim less than the dense width',
    (_, circuit) => {
      const plan = planStructure(circuit, contractOf(circuit));
      const { width } = planWindows(plan);
      expect(width.width).toBeGreaterThanOrEqual(denseWidth(circuit));
      expect(width.width).toBeLessThanOrEqual(plan.width.width);
    },
  );
  test('most of them reach it', () => {
    const reached = small.filter((circuit) => {
      const plan = planStructure(circuit, contractOf(circuit));
      return planWindows(plan).width.width === denseWidth(circuit);
    });
    // not: the sum of two numbers of two bits, and the increment, whose windows would need five wires
    expect(small.length - reached.length).toBeLessThanOrEqual(2);
  });
  test.each(
    WRITTEN.filter(({ wires }) => wires <= 6).map((circuit) => [circuit.name, circuit] as const),
  )('%s: narrowed by structure it is the same', (_, circuit) => {
    const contract = contractOf(circuit);
    for (const wires of [undefined, circuit.wires - 1]) {
      const narrowed = narrowByStructure(circuit, contract, wires ? { wires } : {});
      const inputs = randomInputs(contract, 1);
      const before = simulate(circuit, inputs, contract, 0);
      const after = simulate(narrowed.circuit, inputs, contract, 0);
      expect(outcomeGap(before, after)).toBeLessThan(1e-11);
    }
  });
  test('gates taken together are emitted as they were written', () => {
    const circuit = tripleLayer(6);
    const narrowed = narrowByStructure(circuit, contractOf(circuit));
    expect(narrowed.circuit.wires).toBe(3);
    const names = new Set(
      narrowed.circuit.operations.flatMap((o) => (o.kind === 'gate' ? [o.name] : [])),
    );
    expect([...names].sort()).toEqual(['cx', 'rx', 'rz']);
  });
  test('blocks before measurements become conditions or vanish', () => {
    const circuit = tripleLayer(5);
    const ends = [0, 1, 2, 3, 4].map((wire) => ({ kind: 'measure' as const, wire, bit: wire }));
    for (const operations of [
      [...circuit.operations, ...ends],
      [...circuit.operations.filter((o) => o.kind === 'gate' && o.name !== 'rx'), ...ends],
    ]) {
      const bitRegisters = [{ name: 'c', first: 0, size: 5, scalar: false }];
      const program = { ...circuit, operations, bits: 5, bitRegisters };
      const contract = contractOf(program, { inputs: 'any' });
      const narrowed = narrowByStructure(program, contract);
      expect(narrowed.circuit.wires).toBeLessThanOrEqual(3);
      const inputs = randomInputs(contract, 1);
      const before = simulate(program, inputs, contract, 5);
      const after = simulate(narrowed.circuit, inputs, contract, 5);
      expect(outcomeGap(before, after)).toBeLessThan(1e-11);
    }
  });
});
