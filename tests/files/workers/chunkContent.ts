import type { Chunk } from '../../../src/files/chunkFile.js';

export const COLUMNS = 3;
export const ROWS = 50;
export const PLAN = {
  runId: '0123456789abcdef',
  columns: COLUMNS,
  description: { trials: 1000, sigma: 0.02 },
};

/** What the chunk of a number holds in these tests: doubles of all kinds, the same each time. */
export function chunkOf(number: number): Chunk {
  const rows = Float64Array.from({ length: ROWS * COLUMNS }, (_, k) => Math.sin(number * 1000 + k) / 3);
  rows[0] = -0;
  rows[1] = NaN;
  rows[2] = 5e-324;
  return { number, firstTrial: (number - 1) * ROWS + 1, rows, counters: [number, 2 ** 40] };
}
