/**
 * Everything the page computes goes through here, into workers: whole commands, and small jobs such as
 * reading and drawing. The page's own thread only shows.
 *
 * A `Lane` runs one thing at a time. Stopping asks first and lets the best so far come back; what does not
 * answer within `GRACE_MS`, and what is no longer wanted, is ended at once and its workers with it.
 */
import { type WorkerHandle, WorkerPool } from '../../workers/pool.ts';
import type { CommandRequest, CommandResult } from '../commands.ts';
import type { Control, Progress } from '../control.ts';
import { freeRunning } from '../control.ts';
import { InputError, type InputProblem } from '../input-error.ts';
import type { Job } from '../jobs.ts';

const GRACE_MS = 400;
const WORKERS_MAX = 8;

export type Outcome<T> =
  | { kind: 'answer'; value: T }
  | { kind: 'problems'; problems: readonly InputProblem[] }
  | { kind: 'fault'; message: string }
  | { kind: 'stopped' };

export type Running<T> = {
  outcome: Promise<Outcome<T>>;
  /** Asks for the best so far; ends by force when nobody answers. */
  stop(): void;
  /** Ends at once: the answer is not wanted any more. */
  cancel(): void;
};

function startBrowserWorker(): WorkerHandle {
  const worker = new Worker(new URL('../../workers/worker.ts', import.meta.url), {
    type: 'module',
  });
  return {
    endpoint: worker,
    terminate: () => worker.terminate(),
    onEnd: (listener) => {
      worker.addEventListener('error', (event) => listener(event.message || 'could not start'));
    },
  };
}

export function workersUsable(): number {
  // one core is left for typing and drawing
  return Math.max(1, Math.min(WORKERS_MAX, (navigator.hardwareConcurrency || 2) - 1));
}

export class Lane {
  private readonly size: number;
  private commands: WorkerPool;
  private jobs: WorkerPool;
  private current: Running<unknown> | undefined;

  /** `size`: how many workers the jobs of a command may use. */
  constructor(size: number) {
    this.size = size;
    this.commands = new WorkerPool(startBrowserWorker, 1);
    this.jobs = new WorkerPool(startBrowserWorker, size);
  }

  /** Runs a command; whatever ran here before is cancelled. */
  command(
    request: CommandRequest,
    onProgress: (progress: Progress) => void,
  ): Running<CommandResult> {
    return this.run((control) => this.commands.runCommand(request, this.jobs, control), onProgress);
  }

  /** Runs one job; whatever ran here before is cancelled. */
  job<R>(job: Job): Running<R> {
    return this.run(async (control) => {
      const [result] = await this.jobs.runJobs<Job, R>([job], { control });
      if (result === undefined) throw new Error(`job ${job.id} ended without a result`);
      return result;
    }, freeRunning.report);
  }

  private run<T>(
    start: (control: Control) => Promise<T>,
    onProgress: (progress: Progress) => void,
  ): Running<T> {
    this.current?.cancel();
    let isStopped = false;
    let isOver = false;
    let giveUp: (outcome: Outcome<T>) => void = () => {};
    const gaveUp = new Promise<Outcome<T>>((resolve) => {
      giveUp = resolve;
    });
    const control: Control = {
      report: (progress) => {
        if (!isOver) onProgress(progress);
      },
      stopped: () => isStopped,
      pause: () => undefined,
    };
    const finished = start(control).then(
      (value): Outcome<T> => ({ kind: 'answer', value }),
      // the page shows every error: problems at their places, faults with their text
      (error: unknown): Outcome<T> =>
        error instanceof InputError
          ? { kind: 'problems', problems: error.problems }
          : { kind: 'fault', message: error instanceof Error ? error.message : String(error) },
    );
    const outcome = Promise.race([finished, gaveUp]).then((found) => {
      isOver = true;
      if (this.current === running) this.current = undefined;
      return found;
    });
    const end = (): void => {
      if (isOver) return;
      isOver = true;
      this.restart();
      giveUp({ kind: 'stopped' });
    };
    const running: Running<T> = {
      outcome,
      stop: () => {
        isStopped = true;
        setTimeout(end, GRACE_MS);
      },
      cancel: () => {
        isStopped = true;
        end();
      },
    };
    this.current = running;
    return running;
  }

  private restart(): void {
    this.commands.close();
    this.jobs.close();
    this.commands = new WorkerPool(startBrowserWorker, 1);
    this.jobs = new WorkerPool(startBrowserWorker, this.size);
  }
}
