import { describe, expect, test } from 'vitest';
import {
  type Circuit,
  emptyCircuit,
  type GateOperation,
  gate,
  unitaryGate,
} from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { countCircuit } from '../../src/circuit/counts.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';
import { narrow } from '../../src/narrow.ts';
import { adjoint } from '../../src/numeric/complex-matrix.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { influenceFloor, influenceTables } from '../../src/survey/influence.ts';
import { relationFromTable } from '../../src/survey/relation.ts';
import { planWidth } from '../../src/survey/width.ts';
import { outcomeGap, randomInputs, simulate } from '../plan/branch-simulation.ts';
import { WRITTEN } from '../plan/written-circuits.ts';

const runJobs = inProcess(jobTable);
const at = (operations: readonly GateOperation[], wires: readonly number[]): GateOperation[] =>
  operations.map((operation) => ({
    ...operation,
    wires: operation.wires.map((wire) => wires[wire]!),
  }));

/** A generic gate on two of three wires, hidden: with a turn of the first and the third as one matrix, and then that undone. */
function hidden(seed: number): GateOperation[] {
  const draw = random('hidden', seed);
  const [inner, turn] = [haarUnitary(4, draw), haarUnitary(4, draw)];
  const operations = [unitaryGate(inner, [0, 1]), unitaryGate(turn, [0, 2])];
  const both = circuitUnitary({ ...emptyCircuit(3), operations });
  return [unitaryGate(both, [0, 1, 2]), unitaryGate(adjoint(turn, 4), [0, 2])];
}

/** A staircase of generic gates, width 2, some of them hidden in a detour over a far wire. */
function valley(n: number, openings: number): Circuit {
  const draw = random('valley', n);
  const operations: GateOperation[] = [];
  for (let k = 0; k + 1 < n; k++) {
    const far = (k + 4 + Math.floor(draw() * (n - 6))) % n;
    const isHidden = k % Math.floor(n / openings) === 0 && far !== k && far !== k + 1;
    if (isHidden) operations.push(...at(hidden(k), [k, k + 1, far]));
    else operations.push(gate('u3', [k], 3 * draw(), draw(), draw()), gate('cx', [k, k + 1]), gate('u3', [k + 1], 3 * draw(), draw(), draw()), gate('cx', [k + 1, k])); // biome-ignore format: one gate of the stairs
  }
  return { ...emptyCircuit(n, 0, `valley ${n}`), operations };
}

/** By a simulation of another kind, on random inputs. */
function gapBetween(original: Circuit, narrowed: Circuit): number {
  const contract = contractOf(original);
  const inputs = randomInputs(contract, 1);
  return outcomeGap(simulate(original, inputs, contract, 0), simulate(narrowed, inputs, contract, 0)); // biome-ignore format: one call
}

describe('windows in large circuits', () => {
  test.each([
    [8, 2],
    [30, 4],
    [60, 6],
  ])(
    '%i wires, %i hidden openings: all are found, and the narrowed circuit is proved',
    async (n, openings) => {
      const circuit = valley(n, openings);
      const { report, circuit: narrowed } = await narrow(circuit, { runJobs });
      expect(report).toMatchObject({ verdict: 'narrowed', check: { proof: true } });
      expect(report.after!.wires).toBe(2);
      expect(report.reason).toContain('windows of a few gates allows 2');
      expect(report.distance!.hilbertSchmidt).toBeLessThan(1e-20);
      for (const { wires, entanglers } of report.windows) {
        expect(wires.length).toBeLessThanOrEqual(4);
        expect(entanglers.after).toBeLessThanOrEqual(3);
      }
      if (n <= 8) expect(gapBetween(circuit, narrowed!)).toBeLessThan(1e-10);
    },
  );
});

test('arithmetic, Trotter steps, phase estimation and parity checks written gate by gate: widths and gate counts', async () => {
  const rows: string[] = [];
  let reached = 0;
  let met = 0;
  for (const circuit of WRITTEN.filter(({ wires }) => wires <= 8)) {
    const n = circuit.wires;
    const { kept } = influenceTables(circuitUnitary(circuit), n);
    const dense = planWidth(relationFromTable(kept, n, influenceFloor(n))).width;
    if (dense === n) continue;
    met++;
    const { report, circuit: narrowed } = await narrow(circuit, { runJobs });
    expect(report.verdict).toBe('narrowed');
    expect(gapBetween(circuit, narrowed!)).toBeLessThan(1e-9);
    const [before, after] = [countCircuit(circuit), report.after!];
    const isShort = after.twoQubit < 2 * before.twoQubit;
    if (after.wires === dense && isShort) reached++;
    rows.push(`${circuit.name}: ${n} wires, dense ${dense}, narrowed to ${after.wires}; entanglers ${before.twoQubit} to ${after.twoQubit}`); // biome-ignore format: one row
  }
  console.log(rows.join('\n'));
  expect(met).toBeGreaterThan(5);
  expect(reached / met).toBeGreaterThan(0.7);
}, 300_000);
