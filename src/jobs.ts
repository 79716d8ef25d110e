/**
 * The one seam through which threads, browser workers and, later, a queue enter: `RunJobs` takes a list of
 * jobs (plain data) and gives their results in the same order. The core only ever calls a `RunJobs`; the
 * shells hand in a pool, and `inProcess` is what runs without one. `job-table.ts` lists the kinds.
 */
import { type Control, freeRunning } from './control.ts';

/** What every job carries. Everything in it must survive structured cloning. */
export type Job = {
  kind: string;
  /** Unique in its batch; together with the seed it decides every random number of the job. */
  id: string;
  seed: number;
};

export type RunOptions<R> = {
  control?: Control;
  /**
   * True for a result that makes later jobs needless. The first job in list order with such a result wins:
   * all before it are finished, all after it come back undefined, whatever the number of workers. So the
   * answer never depends on who was faster.
   */
  enough?: (result: R, index: number) => boolean;
};

/** Runs jobs, results in list order; undefined = not needed, or stopped before it finished. */
export type RunJobs = <J extends Job, R>(
  jobs: readonly J[],
  options?: RunOptions<R>,
) => Promise<(R | undefined)[]>;

/** The functions behind the kinds of jobs. */
export type JobTable = {
  readonly [kind: string]: (job: never, control: Control) => unknown | Promise<unknown>;
};

/** Runs every job on the caller's own thread, one after the other. */
export function inProcess(table: JobTable): RunJobs {
  return async <J extends Job, R>(
    jobs: readonly J[],
    { control = freeRunning, enough }: RunOptions<R> = {},
  ): Promise<(R | undefined)[]> => {
    const results: (R | undefined)[] = new Array(jobs.length).fill(undefined);
    for (let index = 0; index < jobs.length; index++) {
      if (control.stopped()) break;
      const job = jobs[index]!;
      const run = table[job.kind];
      if (!run) throw new Error(`internal: unknown kind of job: ${job.kind}`);
      // the table's entry for a kind takes the jobs of that kind: the caller pairs them
      const result = (await run(job as never, control)) as R;
      results[index] = result;
      if (enough?.(result, index)) break;
      await control.pause();
    }
    return results;
  };
}
