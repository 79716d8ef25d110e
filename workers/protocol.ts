/** What crosses between a shell and its workers: types only, so that both sides agree and nothing is loaded twice. */
import type { CommandRequest, CommandResult } from '../src/commands.ts';
import type { Progress } from '../src/control.ts';
import type { InputProblem } from '../src/input-error.ts';
import type { Job } from '../src/jobs.ts';

/** Raised when a message changes its meaning. */
export type ProtocolVersion = 1;

/** An error as plain data: structured cloning would drop its class and fields. */
export type ErrorEnvelope = {
  /** The problems of an InputError; empty for a fault of ours. */
  problems: readonly InputProblem[];
  message: string;
  stack: string;
};

export type Answer<T> = { ok: true; value: T } | { ok: false; error: ErrorEnvelope };

export type ReportProgress = (progress: Progress) => void;

/** Asked on the side of whoever runs the command: does this result make later jobs needless? */
export type IsEnough = (result: unknown, index: number) => boolean | Promise<boolean>;

/** Runs a batch of jobs on the caller's side, for a command that runs inside a worker. */
export type RunBatch = (jobs: readonly Job[], isEnough: IsEnough | null) => Promise<unknown[]>;

export type WorkerApi = {
  version: ProtocolVersion;
  /** Runs one job to its end, or to its best so far after `stop`. */
  run(job: Job, report: ReportProgress): Promise<Answer<unknown>>;
  /** Runs a whole command; its jobs go back to the caller. */
  command(
    request: CommandRequest,
    report: ReportProgress,
    runBatch: RunBatch | null,
  ): Promise<Answer<CommandResult>>;
  /** Asks whatever runs here to stop at its next pause. */
  stop(): void;
};
