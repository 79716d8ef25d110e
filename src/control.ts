/**
 * How a long computation talks to whoever started it: it reports progress, asks whether to go on, and
 * may be asked to pause so that its thread can answer messages. The core knows no clock and no thread;
 * the shells hand in these three functions, and `freeRunning` is what a caller without a shell uses.
 */
export type Progress = {
  /** What is going on, in plain words: `fitting block 2 of 3`. */
  stage: string;
  /** Done part in [0, 1], when it is known. */
  done?: number;
  /** For live convergence: which job and start, which iteration, the distance D reached there. */
  job?: string;
  start?: number;
  iteration?: number;
  distance?: number;
};

export type Control = {
  report(progress: Progress): void;
  /** True once the work is no longer wanted; the callee then returns its best result so far. */
  stopped(): boolean;
  /** Lets the thread breathe; call it every few milliseconds of work. Undefined when there is no need. */
  pause(): Promise<void> | undefined;
};

export const freeRunning: Control = Object.freeze({
  report: () => {},
  stopped: () => false,
  pause: () => undefined,
});
