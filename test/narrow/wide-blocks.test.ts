import { expect, test } from 'vitest';
import { emptyCircuit, unitaryGate } from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { circuitUnitary } from '../../src/circuit/unitary.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';
import { narrow } from '../../src/narrow.ts';
import { shannonCount } from '../../src/native/shannon.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { outcomeGap, randomInputs, simulate } from '../plan/branch-simulation.ts';

test('blocks too wide to be fitted are decomposed: 6 wires to 5, said so, equal by another simulation', async () => {
  const draw = random('wide blocks');
  const blocks = [
    unitaryGate(haarUnitary(32, draw), [0, 1, 2, 3, 4]),
    unitaryGate(haarUnitary(32, draw), [1, 2, 3, 4, 5]),
  ];
  const matrix = circuitUnitary({ ...emptyCircuit(6), operations: blocks });
  const whole = unitaryGate(matrix, [0, 1, 2, 3, 4, 5]);
  const circuit = { ...emptyCircuit(6, 0, 'wide'), operations: [whole] };
  const { report, circuit: narrowed } = await narrow(circuit, { runJobs: inProcess(jobTable) });
  expect(report).toMatchObject({ verdict: 'narrowed', check: { proof: true } });
  expect(report.after!.wires).toBe(5);
  expect(report.after!.twoQubit).toBeLessThanOrEqual(2 * shannonCount(5));
  expect(report.notes.join()).toContain(
    '2 blocks of at most 5 wires were written by a decomposition',
  );
  const contract = contractOf(circuit);
  const inputs = randomInputs(contract, 1);
  const [before, after] = [simulate(circuit, inputs, contract, 0), simulate(narrowed!, inputs, contract, 0)]; // biome-ignore format: one pair
  expect(outcomeGap(before, after)).toBeLessThan(1e-10);
}, 120_000);
