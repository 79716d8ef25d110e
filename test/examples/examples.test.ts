import { readdirSync, readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { type CommandResult, runCommand, type Source } from '../../src/commands.ts';
import { freeRunning } from '../../src/control.ts';
import { examples } from '../../src/examples/index.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';
import type { CompareReport, NarrowReport, SurveyReport } from '../../src/reports.ts';

const folder = new URL('../../src/examples/', import.meta.url);
const source = (name: string): Source => ({
  name,
  text: readFileSync(new URL(name, folder), 'utf8'),
});
const tools = { control: freeRunning, runJobs: inProcess(jobTable) };
const survey = async (name: string): Promise<SurveyReport> =>
  (await runCommand({ command: 'survey', circuit: source(name), options: {} }, tools)).report as SurveyReport; // biome-ignore format: one call
const narrow = (name: string, device?: Source): Promise<CommandResult> =>
  runCommand(
    { command: 'narrow', circuit: source(name), options: device ? { device } : {} },
    tools,
  );
const compare = async (other: string): Promise<CompareReport> =>
  (await runCommand({ command: 'compare', original: source('relay.qasm'), rewritten: source(other), options: {} }, tools)).report as CompareReport; // biome-ignore format: one call

test('the list and the folder hold the same circuits, each with one sentence', () => {
  const files = readdirSync(folder).filter((file) => file.endsWith('.qasm'));
  expect(examples.map(({ file }) => file).sort()).toEqual(files.sort());
  for (const { sentence } of examples) expect(sentence).toMatch(/^[A-Z].*\.$/);
});

describe('each example shows what it says', () => {
  test('a structural pair: order alone is enough', async () => {
    const { report, exitCode } = await narrow('structural-pair.qasm');
    expect(exitCode).toBe(0);
    expect((report as NarrowReport).after!.wires).toBe(2);
    expect((await survey('structural-pair.qasm')).structure.width).toBe(2);
  });

  test('no pair, but an opening', async () => {
    const found = await survey('opening.qasm');
    expect(found.structure.width).toBe(4);
    expect(found.causal!.width).toBe(3);
    expect(found.openings).toEqual([{ leaves: 0, enters: 3 }]);
    const { report, exitCode } = await narrow('opening.qasm');
    expect(exitCode).toBe(0);
    const { after, before, check } = report as NarrowReport;
    expect(after!.wires).toBe(3);
    // simple blocks stay simple: no more entanglers than the circuit had
    expect(after!.twoQubit).toBeLessThanOrEqual(before.twoQubit);
    expect(check).toMatchObject({ proof: true });
  });

  test('a proof that none exists', async () => {
    const { report, exitCode, text } = await narrow('no-opening.qasm');
    expect(exitCode).toBe(1);
    expect(text).toBeNull();
    expect((report as NarrowReport).verdict).toBe('impossible');
    expect((report as NarrowReport).bracket!.lower).toBeGreaterThan(0.05);
  });

  test('a measured Fourier transform fits on one wire, a block of it does not', async () => {
    const { report, exitCode } = await narrow('fourier-measured.qasm');
    expect(exitCode).toBe(0);
    expect((report as NarrowReport).after!.wires).toBe(1);
    const rows = (await survey('fourier-measured.qasm')).widths;
    // Griffiths, Niu, PRL 76, 3228 (1996): 1 when measured; n when kept
    expect(rows.find(({ contract }) => contract === 'any/measured')!.width).toBe(1);
    expect(rows.find(({ contract }) => contract === 'any/kept')!.width).toBe(4);
  });

  test('a pair that is equal, and one that is subtly wrong', async () => {
    expect((await compare('relay-rewritten.qasm')).verdict).toBe('same');
    const off = await compare('relay-off.qasm');
    expect(off.verdict).toBe('different');
    expect(off.witness).not.toBeNull();
  });

  test('forty wires: one wire is enough, proved gate by gate', async () => {
    const found = await survey('forty-stations.qasm');
    expect(found.counts.wires).toBe(40);
    expect(found.structure.width).toBe(2);
    expect(found.early!.width).toBe(1);
    const { report, exitCode } = await narrow('forty-stations.qasm');
    expect(exitCode).toBe(0);
    expect((report as NarrowReport).after!.wires).toBe(1);
    expect((report as NarrowReport).check).toMatchObject({ method: 'gate by gate', proof: true });
  });

  test('the device: an estimate before and after', async () => {
    const { report } = await narrow('structural-pair.qasm', source('valley-device.json'));
    const { before, after } = (report as NarrowReport).estimate!;
    expect(before).toBeGreaterThan(0.5);
    expect(after).toBeGreaterThan(0.5);
    expect(before).not.toBe(after);
  });
});
