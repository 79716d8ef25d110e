/** Small parts that all pages share: running and ended tasks, tables of numbers, saving. */
import type { ComponentChildren } from 'preact';
import { hasComplaint } from './settings.ts';
import type { Task } from './task.ts';
import { problemSentence, sentence } from './words.ts';

type RunProps = {
  task: Task<unknown>;
  start: string;
  again: string;
  isReady: boolean;
  onStart: () => void;
};

/** Start, stop, and start again; and what is going on. */
export function RunBar({ task, start, again, isReady, onStart }: RunProps) {
  const { kind } = task.state.value;
  const isRunning = kind === 'running';
  return (
    <div class="run">
      {isRunning ? (
        <button type="button" class="main" onClick={() => task.stop()}>
          Stop
        </button>
      ) : (
        <button type="button" class="main" disabled={!isReady || hasComplaint()} onClick={onStart}>
          {kind === 'idle' ? start : again}
        </button>
      )}
      <p role="status" class="stage">
        {isRunning ? (
          <>
            <span class="busy" aria-hidden="true" /> {sentence(task.stage.value)}
          </>
        ) : kind === 'stopped' ? (
          (task.state.value as { why: string }).why // narrowed by kind
        ) : (
          ''
        )}
      </p>
    </div>
  );
}

/** What went wrong, if anything did. */
export function Failure({ task }: { task: Task<unknown> }) {
  const state = task.state.value;
  if (state.kind === 'problems') {
    return (
      <div role="alert" class="problems">
        {state.problems.map((problem) => (
          <p class="wrong" key={problem.message}>
            {sentence(problemSentence(problem))}
          </p>
        ))}
      </div>
    );
  }
  if (state.kind === 'fault') {
    return (
      <div role="alert" class="problems">
        <p class="wrong">This is a fault of ours, not of your circuit: {state.message}.</p>
      </div>
    );
  }
  return null;
}

export function Numbers({
  caption,
  rows,
}: {
  caption: string;
  rows: readonly (readonly [string, string])[];
}) {
  return (
    <table class="numbers">
      <caption>{caption}</caption>
      <tbody>
        {rows.map(([name, value]) => (
          <tr key={name}>
            <th scope="row">{name}</th>
            <td>{value}</td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

export function SaveBar({ children }: { children: ComponentChildren }) {
  return (
    <div class="save">
      <span>Save</span>
      {children}
      <button type="button" onClick={() => window.print()}>
        Print the report
      </button>
    </div>
  );
}

export function SaveButton({ label, onSave }: { label: string; onSave: () => void }) {
  return (
    <button type="button" onClick={onSave}>
      {label}
    </button>
  );
}
