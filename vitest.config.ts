import { defineConfig } from 'vitest/config';

// The gate asks for a report that a program can read; a person sees the plain one.
const reportPath = process.env['NIGHTCUT_TEST_REPORT'];

export default defineConfig({
  test: {
    include: ['tests/**/*.test.ts'],
    testTimeout: 60_000,
    hookTimeout: 60_000,
    maxWorkers: 2,
    reporters: reportPath ? ['default', ['json', { outputFile: reportPath }]] : ['default'],
  },
});
