import { expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { probeOf } from '../../src/check/probes.ts';
import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';

/** Gates that the gate-by-gate road cannot undo: Toffolis and turned controls in many places. */
function block(wires: number, gates: number, seed: number): Circuit {
  const draw = random(seed, 'probes');
  const pick = (k: number): number => Math.min(k - 1, Math.floor(k * draw()));
  const operations: GateOperation[] = [];
  for (let k = 0; k < gates; k++) {
    const a = pick(wires);
    const b = (a + 1 + pick(wires - 1)) % wires;
    operations.push(gate('u3', [a], draw(), draw(), draw()), gate('cx', [a, b]));
  }
  return { ...emptyCircuit(wires), operations };
}

/** The same unitary with every CX turned round by four H, in one piece that no local look undoes. */
function turned({ operations, ...rest }: Circuit): Circuit {
  return {
    ...rest,
    operations: operations.flatMap((operation) => {
      if (operation.kind !== 'gate' || operation.name !== 'cx') return [operation];
      const [a, b] = operation.wires as [number, number];
      return [gate('h', [a]), gate('h', [b]), gate('cx', [b, a]), gate('h', [a]), gate('h', [b])];
    }),
  };
}

/** Gates without a form of their own on seven wires each, more than pieces are looked for on: as one matrix, or as a product on four and four. */
function dense(isSplit: boolean): Circuit {
  const haar = (k: number, part: string): Float64Array => haarUnitary(16, random(k, part));
  const operations = [0, 7].flatMap((first, k): GateOperation[] => {
    const [left, right] = [
      unitaryGate(haar(k, 'left'), [first, first + 1, first + 2, first + 3]),
      unitaryGate(haar(k, 'right'), [first + 3, first + 4, first + 5, first + 6]),
    ];
    if (isSplit) return [left, right];
    const both = circuitUnitary({ ...emptyCircuit(7), operations: [left, right].map((g) => ({ ...g, wires: g.wires.map((w) => w - first) })) }); // biome-ignore format: one matrix
    return [
      unitaryGate(
        both,
        Array.from({ length: 7 }, (_, wire) => first + wire),
      ),
    ];
  });
  return { ...emptyCircuit(14), operations };
}

test('14 wires: the same on every probe, and said to be no proof', () => {
  const report = compareCircuits(dense(false), dense(true));
  expect(report).toMatchObject({ verdict: 'same', proof: false, method: 'probes' });
  expect(report.notes.join()).toContain('no proof');
  expect(report.distance!.hilbertSchmidt).toBeLessThan(1e-24);
});

test('14 wires: every CX turned round, which sums over paths prove', () => {
  const original = block(14, 40, 1);
  const report = compareCircuits(original, turned(original));
  expect(report).toMatchObject({ verdict: 'same', proof: true });
});

test('14 wires: one angle off by 1e-3 is a counterexample with its input', () => {
  const original = block(14, 40, 2);
  const other = turned(original);
  const operations = other.operations.map((operation, k) =>
    k === 60 && operation.kind === 'gate'
      ? { ...operation, ...gate('rx', [operation.wires[0]!], 1e-3) }
      : operation,
  );
  const spoiled = { ...other, operations: [...operations, gate('rx', [3], 1e-3)] };
  const report = compareCircuits(original, spoiled);
  expect(report).toMatchObject({ verdict: 'different', proof: true, method: 'probes' });
  expect(report.witness!.input).toMatch(/q\[0\]=ry\(/);
  expect(report.witness!.probabilityOriginal).not.toBe(report.witness!.probabilityRewritten);
});

test('the input is prepared where it enters', () => {
  const original = block(3, 4, 3);
  const probe = probeOf(original, original, contractOf(original), 7, 0);
  expect(probe.contract.inputs).toEqual(['zero', 'zero', 'zero']);
  expect(probe.original.operations).toHaveLength(original.operations.length + 6);
  expect(
    compareCircuits(probe.original, probe.rewritten, { contract: { inputs: 'zero' } }).verdict,
  ).toBe('same');
});
