import { defineConfig } from 'vitest/config';

/** Tests that need packages of Debian: librsvg2-bin. */
export default defineConfig({
  test: { include: ['tests/debian/**/*.test.ts'], testTimeout: 120_000, pool: 'threads' },
});
