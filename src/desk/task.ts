/** Something that runs for a while: what the page shows of it, and how it is stopped. */
import { type Signal, signal } from '@preact/signals';
import type { Progress } from '../control.ts';
import type { InputProblem } from '../input-error.ts';
import type { Outcome, Running } from './engine.ts';

export type TaskState<T> =
  | { kind: 'idle' }
  | { kind: 'running'; startedMs: number }
  | { kind: 'answer'; value: T; seconds: number }
  | { kind: 'problems'; problems: readonly InputProblem[] }
  | { kind: 'fault'; message: string }
  | { kind: 'stopped'; why: string };

export class Task<T> {
  readonly state: Signal<TaskState<T>> = signal<TaskState<T>>({ kind: 'idle' });
  /** What is going on, in words. */
  readonly stage = signal('');
  private running: Running<T> | undefined;
  private number = 0;

  get isRunning(): boolean {
    return this.state.value.kind === 'running';
  }

  /** Follows a running computation to its end; one that was started before is no longer looked at. */
  async follow(running: Running<T>): Promise<Outcome<T>> {
    const number = ++this.number;
    const startedMs = performance.now();
    this.running = running;
    this.stage.value = 'starting';
    this.state.value = { kind: 'running', startedMs };
    const outcome = await running.outcome;
    if (number !== this.number) return { kind: 'stopped' };
    this.running = undefined;
    if (outcome.kind === 'answer') {
      const seconds = Math.round(performance.now() - startedMs) / 1000;
      this.state.value = { ...outcome, seconds };
    } else if (outcome.kind === 'stopped') {
      this.state.value = { kind: 'stopped', why: 'It was stopped before there was a result.' };
    } else this.state.value = outcome;
    return outcome;
  }

  readonly onProgress = (progress: Progress): void => {
    // single iterations belong to the picture of the fits; the line of words keeps its stage
    const isStage = progress.iteration === undefined;
    if (isStage && this.stage.peek() !== progress.stage) this.stage.value = progress.stage;
  };

  /** Asks for the best so far. */
  stop(): void {
    this.running?.stop();
  }

  /** Ends it and forgets it. `why`: what to tell the reader, if anything. */
  clear(why?: string): void {
    this.number++;
    this.running?.cancel();
    this.running = undefined;
    this.state.value = why === undefined ? { kind: 'idle' } : { kind: 'stopped', why };
  }
}
