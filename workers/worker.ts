/**
 * The one worker entry, for Node's threads and for browsers: runs single jobs and whole commands.
 *
 * Progress is passed on at most every `REPORT_EVERY_MS`; a computation pauses every `PAUSE_EVERY_MS` so that `stop` is
 * heard. Errors cross as plain data.
 */
import { expose, proxy } from 'comlink';
import { runCommand } from '../src/commands.ts';
import type { Control, Progress } from '../src/control.ts';
import { InputError } from '../src/input-error.ts';
import { jobTable } from '../src/job-table.ts';
import { inProcess, type Job, type JobTable, type RunJobs, type RunOptions } from '../src/jobs.ts';
import { type NodePort, nodeEndpoint } from './node-endpoint.ts';
import type { Answer, ErrorEnvelope, ReportProgress, RunBatch, WorkerApi } from './protocol.ts';

const REPORT_EVERY_MS = 16;
const PAUSE_EVERY_MS = 30;

let isStopped = false;

function controlFor(report: ReportProgress): Control {
  let lastReport = 0;
  let lastPause = performance.now();
  return {
    report: (progress: Progress) => {
      const now = performance.now();
      if (now - lastReport < REPORT_EVERY_MS) return;
      lastReport = now;
      report(progress);
    },
    stopped: () => isStopped,
    pause: () => {
      const now = performance.now();
      if (now - lastPause < PAUSE_EVERY_MS) return undefined;
      lastPause = now;
      return new Promise((resolve) => setTimeout(resolve, 0));
    },
  };
}

export function envelopeOf(error: unknown): ErrorEnvelope {
  const problems = error instanceof InputError ? error.problems : [];
  const message = error instanceof Error ? error.message : String(error);
  return { problems, message, stack: error instanceof Error ? (error.stack ?? '') : '' };
}

async function answer<T>(run: () => T | Promise<T>): Promise<Answer<T>> {
  isStopped = false;
  try {
    return { ok: true, value: await run() };
  } catch (error) {
    // every error goes back to the caller as data
    return { ok: false, error: envelopeOf(error) };
  }
}

function batchRunner(runBatch: RunBatch | null): RunJobs {
  if (!runBatch) return inProcess(jobTable);
  return async <J extends Job, R>(jobs: readonly J[], { enough }: RunOptions<R> = {}) => {
    const isEnough =
      enough && proxy((result: unknown, index: number) => enough(result as R, index));
    // the results are those of the jobs, in their order
    return (await runBatch(jobs, isEnough ?? null)) as (R | undefined)[];
  };
}

const api: WorkerApi = {
  version: 1,
  run: (job: Job, report) =>
    answer(() => {
      const run = (jobTable as JobTable)[job.kind];
      if (!run) throw new Error(`internal: unknown kind of job: ${job.kind}`);
      return run(job as never, controlFor(report)); // the table pairs kinds and jobs
    }),
  command: (request, report, runBatch) =>
    answer(() =>
      runCommand(request, { control: controlFor(report), runJobs: batchRunner(runBatch) }),
    ),
  stop: () => {
    isStopped = true;
  },
};

type NodeProcess = { getBuiltinModule?(name: string): { parentPort: NodePort | null } | undefined };
const { process: node } = globalThis as { process?: NodeProcess };
const port = node?.getBuiltinModule?.('node:worker_threads')?.parentPort;
expose(api, port ? nodeEndpoint(port) : (globalThis as unknown as Parameters<typeof expose>[1]));
