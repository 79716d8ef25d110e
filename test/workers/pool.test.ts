import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import { build } from 'esbuild';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import type { CommandRequest } from '../../src/commands.ts';
import { runCommand } from '../../src/commands.ts';
import { type Control, freeRunning, type Progress } from '../../src/control.ts';
import { InputError } from '../../src/input-error.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import type { FitJob, FitResult } from '../../src/reshape/fit-block.ts';
import { entanglerTemplate } from '../../src/reshape/template.ts';
import { writeMatrixMarket } from '../../src/write/matrix-market.ts';
import { startNodeWorker } from '../../workers/node-worker.ts';
import { type WorkerHandle, WorkerPool } from '../../workers/pool.ts';

const folder = mkdtempSync(join(tmpdir(), 'wiregauge-worker-'));
const file = join(folder, 'worker.mjs');
const start = (): WorkerHandle => startNodeWorker(pathToFileURL(file));

beforeAll(async () => {
  await build({
    entryPoints: ['workers/worker.ts'],
    outfile: file,
    bundle: true,
    format: 'esm',
    platform: 'node',
    target: 'node20',
    logLevel: 'error',
    banner: {
      js: "import { createRequire as _require } from 'node:module'; const require = _require(import.meta.url);",
    },
  });
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const pairs = Array.from({ length: 14 }, (_, k) => [[0, 1], [0, 2], [1, 2]][k % 3] as [number, number]); // biome-ignore format: cyclic pairs
const fitJob = (id: string, iterationsMax = 60, wires = 3): FitJob => ({
  kind: 'fit',
  id,
  seed: 3,
  template: entanglerTemplate(wires, pairs),
  target: { kind: 'unitary', matrix: haarUnitary(2 ** wires, random(7)) },
  optimiser: 'lm',
  goal: 1e-20,
  iterationsMax,
});

async function withPool<T>(size: number, run: (pool: WorkerPool) => Promise<T>): Promise<T> {
  const pool = new WorkerPool(start, size);
  try {
    return await run(pool);
  } finally {
    pool.close();
  }
}

describe('a batch of fits', () => {
  const jobs = ['a', 'b', 'c', 'd', 'e'].map((id) => fitJob(id));
  // two of the starts reach the goal at different places of the list
  const enough = (result: FitResult): boolean => result.distance < 1e-12;

  test.each([1, 2, 4])(
    '%i workers: the same bytes as in-process, with and without a stop rule',
    async (size) => {
      const expected = await inProcess(jobTable)<FitJob, FitResult>(jobs);
      const first = await inProcess(jobTable)<FitJob, FitResult>(jobs, { enough });
      await withPool(size, async (pool) => {
        expect(await pool.runJobs<FitJob, FitResult>(jobs)).toEqual(expected);
        expect(await pool.runJobs<FitJob, FitResult>(jobs, { enough })).toEqual(first);
      });
      expect(first.some((result) => result === undefined)).toBe(true);
    },
  );

  test('progress arrives with the number of the start', async () => {
    const seen: Progress[] = [];
    const control: Control = { ...freeRunning, report: (progress) => seen.push(progress) };
    await withPool(2, (pool) => pool.runJobs(jobs, { control }));
    expect(seen.some(({ start: k, iteration, distance }) => k !== undefined && iteration! > 0 && distance! > 0)).toBe(true); // biome-ignore format: one check
  });

  test('a worker that dies has its job run again, once', async () => {
    const expected = await inProcess(jobTable)<FitJob, FitResult>(jobs);
    const started: WorkerHandle[] = [];
    const pool = new WorkerPool(() => {
      const handle = start();
      started.push(handle);
      return handle;
    }, 2);
    const control: Control = {
      ...freeRunning,
      // the first word from a worker is its last
      report: () => started.length === 2 && started[0]!.terminate(),
    };
    try {
      expect(await pool.runJobs<FitJob, FitResult>(jobs, { control })).toEqual(expected);
      expect(started.length).toBe(3);
    } finally {
      pool.close();
    }
  });

  test('a job that kills every worker is an error, not a wait for ever', async () => {
    const pool = new WorkerPool(() => {
      const handle = start();
      setTimeout(() => handle.terminate(), 5);
      return handle;
    }, 1);
    await expect(pool.runJobs([fitJob('x', 4000)])).rejects.toThrow('was lost twice');
    pool.close();
  });

  test('a stop is heard within a second, and gives the best so far', async () => {
    let isStopped = false;
    const control: Control = { ...freeRunning, stopped: () => isStopped };
    await withPool(2, async (pool) => {
      const long = ['p', 'q'].map((id) => ({ ...fitJob(id, 1e6), goal: -1 }));
      setTimeout(() => {
        isStopped = true;
      }, 600);
      const before = Date.now();
      const results = await pool.runJobs<FitJob, FitResult>(long, { control });
      expect(Date.now() - before).toBeLessThan(20_000);
      for (const result of results) if (result) expect(result.distance).toBeLessThan(1);
    });
  });
});

describe('whole commands', () => {
  function chain(): string {
    // two blocks on wires 0-2 and 1-3 of four: 4 wires become 3
    const [a, b] = [haarUnitary(8, random(31)), haarUnitary(8, random(32))];
    const d = 16;
    const out = new Float64Array(2 * d * d);
    for (let r = 0; r < d; r++) {
      for (let c = 0; c < d; c++) {
        // (1 x b)(a x 1), entry by entry
        for (let m = 0; m < 4; m++) {
          const inner = (r >> 3) * 4 + m;
          const [p, q] = [(r & 7) * 8 + m * 2 + (c & 1), inner * 8 + (c >> 1)];
          const [br, bi, ar, ai] = [b[p]!, b[64 + p]!, a[q]!, a[64 + q]!];
          out[r * d + c]! += br * ar - bi * ai;
          out[d * d + r * d + c]! += br * ai + bi * ar;
        }
      }
    }
    return writeMatrixMarket(out, d, d);
  }
  const request: CommandRequest = {
    command: 'narrow',
    circuit: { name: 'chain.mtx', text: chain() },
    options: { seed: 2 },
  };

  test('narrow writes the same bytes for 0, 1, 2 and 4 workers', async () => {
    const alone = await runCommand(request, { control: freeRunning, runJobs: inProcess(jobTable) });
    expect(alone.exitCode).toBe(0);
    expect(alone.text).toContain('@wiregauge.enters');
    for (const size of [1, 2, 4]) {
      await withPool(size, (jobs) =>
        withPool(1, async (command) => {
          const result = await command.runCommand(request, jobs, freeRunning);
          expect(result.text).toBe(alone.text);
          expect(result.report).toEqual(alone.report);
        }),
      );
    }
  });

  test('mistakes in the input cross as they are', async () => {
    const bad: CommandRequest = {
      command: 'survey',
      circuit: { name: 'bad.qasm', text: 'OPENQASM 3;\nqubit[2] q;\nfoo q[0];\nh q[5];\n' },
      options: {},
    };
    await withPool(1, (jobs) =>
      withPool(1, async (command) => {
        const error = await command.runCommand(bad, jobs, freeRunning).catch((e: unknown) => e);
        expect(error).toBeInstanceOf(InputError);
        const { problems } = error as InputError;
        expect(problems[0]).toMatchObject({ file: 'bad.qasm', line: 3, column: 1 });
      }),
    );
  });
});
