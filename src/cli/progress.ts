/** Shows progress on standard error: a bar on a terminal, a line per stage in a pipe, nothing when quiet. */
import cliProgress from 'cli-progress';
import type { Progress } from '../control.ts';

export type ProgressView = { show(progress: Progress): void; end(): void };

export function progressView(isQuiet: boolean): ProgressView {
  if (isQuiet) return { show: () => {}, end: () => {} };
  return process.stderr.isTTY ? barView() : lineView();
}

function detail({ start, iteration, distance }: Progress): string {
  const parts = [
    start === undefined ? '' : `start ${start + 1}`,
    iteration === undefined ? '' : `iteration ${iteration}`,
    distance === undefined ? '' : `D ${distance.toExponential(1)}`,
  ];
  return parts.filter((part) => part !== '').join(', ');
}

function barView(): ProgressView {
  const bar = new cliProgress.SingleBar({
    format: '{bar} {stage} {detail}',
    stream: process.stderr,
    hideCursor: true,
    clearOnComplete: true,
    barsize: 20,
  });
  let isRunning = false;
  return {
    show: (progress) => {
      const payload = { stage: progress.stage, detail: detail(progress) };
      if (!isRunning) {
        bar.start(100, 0, payload);
        isRunning = true;
      }
      bar.update(Math.round(100 * (progress.done ?? 0)), payload);
    },
    end: () => {
      if (isRunning) bar.stop();
    },
  };
}

function lineView(): ProgressView {
  let last = '';
  return {
    show: ({ stage, iteration }) => {
      // one line per stage; single iterations would flood a log
      if (stage === last || iteration !== undefined) return;
      last = stage;
      process.stderr.write(`${stage}\n`);
    },
    end: () => {},
  };
}
