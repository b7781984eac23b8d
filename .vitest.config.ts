import { defineConfig } from 'vitest/config';

export default defineConfig({
  test: {
    include: ['tests/**/*.test.ts'],
    exclude: ['tests/debian/**'],
    testTimeout: 60_000,
    hookTimeout: 120_000,
    pool: 'threads',
  },
});
