/**
 * Runs one command: in a worker of its own, so that Ctrl-C is heard at once, with its fits on further workers; or, with
 * no workers, on this thread.
 */
import { startNodeWorker } from '../../workers/node-worker.ts';
import { WorkerPool } from '../../workers/pool.ts';
import { type CommandRequest, type CommandResult, runCommand } from '../commands.ts';
import type { Control, Progress } from '../control.ts';
import { jobTable } from '../job-table.ts';
import { inProcess } from '../jobs.ts';

/** After this long a stopped command is ended even when it does not answer. */
const GRACE_MS = 900;
/** The same at the time limit of a build, which has a result by then: writing it out may take a while. */
const BUILD_GRACE_MS = 6000;

export type Ended = { result: CommandResult | null; isInterrupted: boolean; isTimedOut: boolean };

export type RunSettings = {
  workers: number;
  timeLimitSeconds?: number;
  onProgress: (progress: Progress) => void;
};

export async function runToEnd(
  request: CommandRequest,
  { workers, timeLimitSeconds, onProgress }: RunSettings,
): Promise<Ended> {
  let isInterrupted = false;
  let isTimedOut = false;
  let giveUp: (afterMs: number) => void = () => {};
  const gaveUp = new Promise<null>((resolve) => {
    giveUp = (afterMs) => setTimeout(() => resolve(null), afterMs).unref();
  });
  const control: Control = {
    report: onProgress,
    stopped: () => isInterrupted || isTimedOut,
    pause: () => new Promise((resolve) => setImmediate(resolve)),
  };
  const onSignal = (): void => {
    // a second time means now
    if (isInterrupted) process.exit(130);
    isInterrupted = true;
    giveUp(GRACE_MS);
  };
  process.on('SIGINT', onSignal);
  process.on('SIGTERM', onSignal);
  const limit =
    timeLimitSeconds === undefined
      ? undefined
      : setTimeout(() => {
          isTimedOut = true;
          giveUp(request.command === 'build' ? BUILD_GRACE_MS : GRACE_MS);
        }, timeLimitSeconds * 1000);
  const workerUrl = new URL('./worker.js', import.meta.url);
  const start = () => startNodeWorker(workerUrl);
  const jobs = workers > 0 ? new WorkerPool(start, workers) : undefined;
  const command = workers > 0 ? new WorkerPool(start, 1) : undefined;
  try {
    const run =
      jobs && command
        ? command.runCommand(request, jobs, control)
        : runCommand(request, { control, runJobs: inProcess(jobTable) });
    const result = await Promise.race([run, gaveUp]);
    return { result, isInterrupted, isTimedOut };
  } finally {
    if (limit) clearTimeout(limit);
    process.off('SIGINT', onSignal);
    process.off('SIGTERM', onSignal);
    jobs?.close();
    command?.close();
  }
}
