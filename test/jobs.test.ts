import { expect, test } from 'vitest';
import { freeRunning } from '../src/control.ts';
import { inProcess, type Job } from '../src/jobs.ts';

type Square = Job & { kind: 'square'; value: number };
const table = { square: ({ value }: Square) => value * value };
const jobs: Square[] = [1, 2, 3, 4].map((value) => ({
  kind: 'square',
  id: `${value}`,
  seed: 1,
  value,
}));

test('results come in list order', async () => {
  expect(await inProcess(table)<Square, number>(jobs)).toEqual([1, 4, 9, 16]);
});

test('nothing after the first result that is enough is kept', async () => {
  const results = await inProcess(table)<Square, number>(jobs, { enough: (value) => value >= 4 });
  expect(results).toEqual([1, 4, undefined, undefined]);
});

test('a stopped run gives what it has', async () => {
  let asked = 0;
  const control = { ...freeRunning, stopped: () => ++asked > 2 };
  expect(await inProcess(table)<Square, number>(jobs, { control })).toEqual([
    1,
    4,
    undefined,
    undefined,
  ]);
});

test('an unknown kind of job is a fault of ours', async () => {
  const strange = [{ kind: 'cube', id: 'x', seed: 1 }];
  await expect(inProcess(table)(strange)).rejects.toThrow('internal: unknown kind of job: cube');
});
