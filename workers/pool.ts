/**
 * Runs jobs on several workers. The answer is that of `inProcess`, whatever the number of workers: results come in list
 * order, and after the first result that is enough nothing is kept.
 *
 * A worker that dies gives its job back, which runs once more on another; a second death is an error. A stop is asked
 * for by message first; workers that do not answer within `GRACE_MS` are ended, and new ones start when needed.
 */
import { type Endpoint, proxy, type Remote, wrap } from 'comlink';
import type { CommandRequest, CommandResult } from '../src/commands.ts';
import type { Control, Progress } from '../src/control.ts';
import { freeRunning } from '../src/control.ts';
import { InputError } from '../src/input-error.ts';
import type { Job, RunJobs, RunOptions } from '../src/jobs.ts';
import type { Answer, ErrorEnvelope, WorkerApi } from './protocol.ts';

const GRACE_MS = 500;
const POLL_MS = 40;

/** A started worker, however the platform makes it. */
export type WorkerHandle = {
  endpoint: Endpoint;
  /** Ends it at once. */
  terminate(): void;
  /** Calls back when it fails or ends by itself. */
  onEnd(listener: (reason: string) => void): void;
};

type Slot = {
  handle: WorkerHandle;
  api: Remote<WorkerApi>;
  ended: Promise<string>;
  /** Ends the worker and says so; a browser's own `terminate` tells nobody. */
  end(reason: string): void;
  isFree: boolean;
  /** Counts the calls it was given, so that a late timer does not end the wrong one. */
  calls: number;
};

export function errorOf({ problems, message, stack }: ErrorEnvelope): Error {
  if (problems.length > 0) return new InputError(problems);
  const error = new Error(message);
  error.stack = stack || message;
  return error;
}

class WorkerLost extends Error {}

export class WorkerPool {
  private readonly slots: Slot[] = [];
  private readonly waiting: ((slot: Slot) => void)[] = [];
  private readonly start: () => WorkerHandle;
  private readonly size: number;

  constructor(start: () => WorkerHandle, size: number) {
    this.start = start;
    this.size = Math.max(1, size);
  }

  /** A worker that nobody uses, started if there is room; waits otherwise. */
  private take(): Promise<Slot> {
    const free = this.slots.find(({ isFree }) => isFree);
    if (free) {
      free.isFree = false;
      return Promise.resolve(free);
    }
    if (this.slots.length < this.size) {
      const handle = this.start();
      let tell: (reason: string) => void = () => {};
      const ended = new Promise<string>((resolve) => {
        tell = resolve;
        handle.onEnd(resolve);
      });
      const slot: Slot = {
        handle,
        api: wrap<WorkerApi>(handle.endpoint),
        ended,
        end: (reason) => {
          handle.terminate();
          tell(reason);
        },
        isFree: false,
        calls: 0,
      };
      this.slots.push(slot);
      return Promise.resolve(slot);
    }
    return new Promise((resolve) => {
      this.waiting.push(resolve);
    });
  }

  private give(slot: Slot): void {
    const next = this.waiting.shift();
    if (next) next(slot);
    else slot.isFree = true;
  }

  private drop(slot: Slot): void {
    slot.end('dropped');
    this.slots.splice(this.slots.indexOf(slot), 1);
    const next = this.waiting.shift();
    if (next) void this.take().then(next);
  }

  /** A call that settles even when the worker dies: then it is `WorkerLost`. */
  private async call<T>(
    slot: Slot,
    run: (api: Remote<WorkerApi>) => Promise<Answer<T>>,
  ): Promise<T> {
    slot.calls++;
    const lost = slot.ended.then((reason) => {
      throw new WorkerLost(reason);
    });
    // the loser of the race must not count as unhandled
    lost.catch(() => {});
    const answer = await Promise.race([run(slot.api), lost]);
    if (answer.ok) return answer.value;
    throw errorOf(answer.error);
  }

  readonly runJobs: RunJobs = async <J extends Job, R>(
    jobs: readonly J[],
    { control = freeRunning, enough }: RunOptions<R> = {},
  ): Promise<(R | undefined)[]> => {
    const results: (R | undefined)[] = new Array(jobs.length).fill(undefined);
    const running = new Map<number, Slot>();
    let next = 0;
    // no job from here on is needed
    let end = jobs.length;
    let isStopping = false;
    const stopFrom = (index: number): void => {
      end = Math.min(end, index);
      for (const [k, slot] of running) if (k >= end) this.stopSlot(slot);
    };
    const poll = setInterval(() => {
      if (isStopping || !control.stopped()) return;
      isStopping = true;
      for (const slot of running.values()) this.stopSlot(slot);
    }, POLL_MS);
    const worker = async (): Promise<void> => {
      while (next < end && !isStopping && !control.stopped()) {
        const index = next++;
        const result = await this.runOne<R>(
          jobs[index]!,
          index,
          running,
          control,
          () => isStopping || index >= end,
        );
        if (result === undefined || index >= end) continue;
        results[index] = result;
        if (enough && (await enough(result, index))) stopFrom(index + 1);
      }
    };
    try {
      await Promise.all(Array.from({ length: Math.min(this.size, jobs.length) }, worker));
    } finally {
      clearInterval(poll);
    }
    return results.map((result, index) => (index < end ? result : undefined));
  };

  private async runOne<R>(
    job: Job,
    index: number,
    running: Map<number, Slot>,
    control: Control,
    isUnwanted: () => boolean,
  ): Promise<R | undefined> {
    for (let attempt = 0; ; attempt++) {
      const slot = await this.take();
      if (isUnwanted()) {
        this.give(slot);
        return undefined;
      }
      running.set(index, slot);
      const report = proxy((progress: Progress) => {
        control.report({ start: index, ...progress });
      });
      try {
        const value = await this.call(slot, (api) => api.run(job, report));
        running.delete(index);
        this.give(slot);
        return value as R; // the worker's table gives the result of this kind of job
      } catch (error) {
        running.delete(index);
        if (!(error instanceof WorkerLost)) {
          this.give(slot);
          throw error;
        }
        this.drop(slot);
        if (isUnwanted()) return undefined;
        if (attempt >= 1)
          throw new Error(`internal: job ${job.id} was lost twice: ${error.message}`);
      }
    }
  }

  private stopSlot(slot: Slot): void {
    void slot.api.stop();
    const { calls } = slot;
    const timer = setTimeout(() => {
      const isSameCall = slot.calls === calls && !slot.isFree;
      if (this.slots.includes(slot) && isSameCall) slot.end('it did not stop when asked');
    }, GRACE_MS);
    void slot.ended.then(() => clearTimeout(timer));
    (timer as { unref?: () => void }).unref?.();
  }

  /** Runs a whole command in a worker of its own; its jobs run on the others. */
  async runCommand(
    request: CommandRequest,
    jobs: WorkerPool,
    control: Control,
  ): Promise<CommandResult> {
    const slot = await this.take();
    const poll = setInterval(() => {
      if (control.stopped()) void slot.api.stop();
    }, POLL_MS);
    try {
      const report = proxy(control.report);
      const batch = proxy((list: readonly Job[], isEnough: unknown) =>
        jobs.runJobs(list, {
          control,
          ...(isEnough ? { enough: isEnough as (result: unknown, index: number) => boolean } : {}),
        }),
      );
      return await this.call(slot, (api) => api.command(request, report, batch));
    } finally {
      clearInterval(poll);
      this.give(slot);
    }
  }

  /** Ends all workers. */
  close(): void {
    for (const slot of this.slots.splice(0)) slot.end('the pool was closed');
  }
}
