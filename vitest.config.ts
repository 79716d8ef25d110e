import { defineConfig } from 'vitest/config';

// one seed for every generator of random cases, so that a failure replays
export const TEST_SEED = 20_260_901;

// biome-ignore lint/style/noDefaultExport: vitest asks for it
export default defineConfig({
  test: {
    include: ['test/**/*.test.ts'],
    exclude: ['test/bench/**', 'node_modules/**'],
    testTimeout: 60_000,
    hookTimeout: 60_000,
    pool: 'forks',
    maxWorkers: 2,
    sequence: { seed: TEST_SEED },
  },
});
