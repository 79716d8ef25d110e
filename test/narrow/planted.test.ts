import { expect, test } from 'vitest';
import { contractOf } from '../../src/circuit/contract.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';
import { narrow } from '../../src/narrow.ts';
import { planStructure } from '../../src/plan/structure-plan.ts';
import { influenceFloor, influenceTables } from '../../src/survey/influence.ts';
import { relationFromTable } from '../../src/survey/relation.ts';
import { planWidth } from '../../src/survey/width.ts';
import { outcomeGap, randomInputs, simulate } from '../plan/branch-simulation.ts';
import { planted } from '../support/planted-windows.ts';

const runJobs = inProcess(jobTable);

test.each([
  [8, [3, 3], 1],
  [30, [3, 4, 3, 3], 2],
  [60, [3, 4, 3, 4, 3, 3], 3],
  [100, [3, 3, 3], 4],
])(
  '%i wires, openings planted in %j wires of u3 and cx (seed %i): all are found and proved',
  async (wires, sizes, seed) => {
    const { circuit, openings, widest } = planted(wires, sizes, seed);
    const contract = contractOf(circuit);
    expect(planStructure(circuit, contract).width.width).toBe(widest);
    const { report, circuit: narrowed } = await narrow(circuit, { runJobs });
    expect(report).toMatchObject({ verdict: 'narrowed', check: { proof: true } });
    expect(report.after!.wires).toBe(2);
    expect(report.windows.length).toBe(openings);
    expect(report.distance!.hilbertSchmidt).toBeLessThan(1e-20);
    expect(report.after!.twoQubit).toBeLessThan(report.before.twoQubit);
    // three for each generic gate of the staircase before it was hidden
    expect(report.after!.twoQubit).toBeLessThanOrEqual(3 * (wires - 1));
    for (const { wires: on, entanglers } of report.windows) {
      expect(on.length).toBeLessThanOrEqual(4);
      expect(entanglers.after).toBeLessThan(entanglers.before);
    }
    if (wires > 8) return;
    const inputs = randomInputs(contract, seed);
    const [before, after] = [simulate(circuit, inputs, contract, 0), simulate(narrowed!, inputs, contract, 0)]; // biome-ignore format: one pair
    expect(outcomeGap(before, after)).toBeLessThan(1e-10);
    const { kept } = influenceTables(circuitUnitary(circuit), wires);
    expect(planWidth(relationFromTable(kept, wires, influenceFloor(wires))).width).toBe(2);
  },
  300_000,
);
