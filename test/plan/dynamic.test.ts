import { describe, expect, test } from 'vitest';
import { type Circuit, emptyCircuit, gate, type Operation } from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import type { ContractOptions } from '../../src/contract.ts';
import { random } from '../../src/numeric/random.ts';
import { narrowByStructure } from '../../src/plan/structure.ts';
import { surveyCircuit } from '../../src/survey/survey.ts';
import { outcomeGap, randomInputs, simulate } from './branch-simulation.ts';

/** Gates, measurements on the way, resets and conditions, at random. */
function randomProgram(n: number, length: number, seed: number): Circuit {
  const draw = random('dynamic', seed);
  const bits = n + 2;
  const pick = (size: number): number => Math.floor(draw() * size);
  const operations: Operation[] = [];
  const written = new Set<number>();
  while (operations.length < length) {
    const a = pick(n);
    const b = (a + 1 + pick(n - 1)) % n;
    const kind = draw();
    let next: Operation;
    if (kind < 0.3) next = gate(['h', 't', 'x', 'sx'][pick(4)]!, [a]);
    else if (kind < 0.75) {
      const name = ['cx', 'cz', 'swap', 'rzz', 'crx', 'cp'][pick(6)]!;
      next = gate(name, [a, b], ...(['rzz', 'crx', 'cp'].includes(name) ? [draw() * 3] : []));
    } else if (kind < 0.87) {
      const bit = pick(bits);
      written.add(bit);
      next = { kind: 'measure', wire: a, bit };
    } else if (kind < 0.95) next = { kind: 'reset', wire: a };
    else if (kind < 0.98)
      next = { kind: 'assign', bit: pick(bits), value: { kind: 'bit', bit: pick(bits) } };
    else next = { kind: 'barrier', wires: [a, b] };
    const mayDepend = next.kind !== 'barrier';
    if (mayDepend && written.size > 0 && draw() < 0.3) {
      const list = [...written];
      const bit = { kind: 'bit' as const, bit: list[pick(list.length)]! };
      next = { ...next, condition: draw() < 0.5 ? bit : { kind: 'not', of: bit } };
    }
    operations.push(next);
  }
  for (let wire = 0; wire < n; wire++) {
    if (draw() < 0.6) operations.push({ kind: 'measure', wire, bit: wire });
  }
  return { ...emptyCircuit(n, bits), operations };
}

function check(circuit: Circuit, options: ContractOptions, wires?: number): void {
  const contract = contractOf(circuit, options);
  const narrowed = narrowByStructure(circuit, contract, wires ? { wires } : {});
  const inputs = randomInputs(contract, 7);
  const before = simulate(circuit, inputs, contract, circuit.bits);
  const after = simulate(narrowed.circuit, inputs, contract, circuit.bits);
  expect(outcomeGap(before, after)).toBeLessThan(1e-11);
}

describe('programs that measure, reset and decide on the way keep their meaning', () => {
  test.each(Array.from({ length: 60 }, (_, k) => k + 1))('seed %i', (seed) => {
    const circuit = randomProgram(3, 8 + (seed % 9), seed);
    check(circuit, {});
    check(circuit, { inputs: 'any' });
    check(circuit, { inputs: 'any', outputs: 'kept' });
    check(circuit, {}, 3);
    const report = surveyCircuit(circuit);
    expect(report.structure.width).toBeLessThanOrEqual(3);
    expect(report.structure.width).toBeGreaterThanOrEqual(1);
  });
});
