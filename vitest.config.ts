import { defineConfig } from 'vitest/config';

// Whole-program tests start real processes; two files at a time keep a two-core machine honest.
export default defineConfig({
  test: {
    include: ['test/**/*.test.ts'],
    testTimeout: 60_000,
    maxWorkers: 2,
  },
});
