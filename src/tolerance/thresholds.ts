import type { Merit } from '../merit/merit.js';
import { isUpperLimit } from '../merit/merit.js';

/**
 * A figure of merit and the limit that a good chip keeps: an upper limit for errors, a lower one for all
 * others.
 */
export interface Threshold {
  readonly key: keyof Merit;
  readonly limit: number;
}

/**
 * The figures that must be judged for thresholds: fidelity, which is always reported, and those of the
 * thresholds, each once.
 */
export function judgedFigures(thresholds: readonly Threshold[]): (keyof Merit)[] {
  return [...new Set<keyof Merit>(['fidelity', ...thresholds.map(({ key }) => key)])];
}

/** How many rows of judged figures keep all thresholds. NaN keeps none. */
export function countPassed(
  rows: Float64Array,
  figures: readonly (keyof Merit)[],
  thresholds: readonly Threshold[],
): number {
  const columns = figures.length;
  const tests = thresholds.map(({ key, limit }) => ({
    column: figures.indexOf(key),
    sign: isUpperLimit(key) ? -1 : 1,
    limit,
  }));
  let passed = 0;
  for (let at = 0; at < rows.length; at += columns) {
    if (tests.every(({ column, sign, limit }) => sign * rows[at + column]! >= sign * limit)) passed++;
  }
  return passed;
}

/** One judged figure of all rows. */
export function columnOf(rows: Float64Array, columns: number, column: number): Float64Array {
  return Float64Array.from({ length: rows.length / columns }, (_, k) => rows[k * columns + column]!);
}
