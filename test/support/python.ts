/**
 * Runs a Python script with NumPy as an outside reference: `input` goes in as JSON on standard input, what it
 * prints comes back parsed. Where there is no Python with NumPy, `pythonTest` says so and skips; in CI (the
 * environment variable CI is set) it fails instead.
 */
import { spawnSync } from 'node:child_process';
import { test } from 'vitest';

function probe(modules: string): boolean {
  return spawnSync('python3', ['-c', `import ${modules}`], { stdio: 'ignore' }).status === 0;
}

export const hasNumpy = probe('numpy');

/** Runs the script; throws with Python's own words when it fails. */
export function python(script: string, input: unknown = null): unknown {
  const { status, stdout, stderr } = spawnSync('python3', ['-c', script], {
    input: JSON.stringify(input),
    encoding: 'utf8',
    maxBuffer: 1 << 28,
    env: { ...process.env, OMP_NUM_THREADS: '1', OPENBLAS_NUM_THREADS: '1' },
  });
  if (status !== 0) throw new Error(`python3 ended with ${status}: ${stderr}`);
  return JSON.parse(stdout);
}

/** A test that needs Python with NumPy (and the further modules named, such as `scipy`). */
export function pythonTest(
  name: string,
  run: () => void | Promise<void>,
  { modules = 'numpy', timeoutMs = 60_000 }: { modules?: string; timeoutMs?: number } = {},
): void {
  const isHere = modules === 'numpy' ? hasNumpy : probe(modules);
  if (isHere || process.env.CI) {
    test(name, run, timeoutMs);
    return;
  }
  console.warn(`SKIPPED (no python3 with ${modules} here): ${name}`);
  test.skip(name, run);
}
