/**
 * Runs hostile requests through the commands in a process of its own, one after the other; a test starts it. Standard input: a JSON
 * list of [name, request]; standard output: one JSON line a case, {name, outcome, message, seconds, megabytes}, so that a case that
 * hangs is known by its name.
 */
import { readFileSync, writeSync } from 'node:fs';
import { type CommandRequest, runCommand } from '../../src/commands.ts';
import { InputError } from '../../src/input-error.ts';
import { jobTable } from '../../src/job-table.ts';
import { inProcess } from '../../src/jobs.ts';

/** Commands are asked to stop after this long; how soon they do is what the times show. */
const LIMIT_MS = 1000;

const cases = JSON.parse(readFileSync(0, 'utf8')) as [string, CommandRequest][];
for (const [name, request] of cases) {
  writeSync(1, `${JSON.stringify({ name, outcome: 'started' })}\n`);
  const started = performance.now();
  let [outcome, message] = ['', ''];
  try {
    const { exitCode } = await runCommand(request, {
      control: {
        report: () => {},
        stopped: () => performance.now() - started > LIMIT_MS,
        pause: () => new Promise((resolve) => setImmediate(resolve)),
      },
      runJobs: inProcess(jobTable),
    });
    outcome = `exit ${exitCode}`;
  } catch (error) {
    outcome = error instanceof InputError ? 'refused' : 'fault';
    message = error instanceof Error ? `${error.message.slice(0, 500)}` : String(error);
    if (outcome === 'fault' && error instanceof Error) message += `\n${error.stack}`;
  }
  const seconds = (performance.now() - started) / 1000;
  const megabytes = process.resourceUsage().maxRSS / 1024;
  writeSync(1, `${JSON.stringify({ name, outcome, message, seconds, megabytes })}\n`);
}
