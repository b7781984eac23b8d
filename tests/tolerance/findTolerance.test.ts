import { describe, expect, it } from 'vitest';
import { randomStream } from '../../src/random/RandomStream.js';
import { clopperPearson } from '../../src/statistics/binomialInterval.js';
import type { ToleranceEstimate, ToleranceSearch, YieldCount } from '../../src/tolerance/findTolerance.js';
import { findFewestBits, findTolerance } from '../../src/tolerance/findTolerance.js';

const USUAL = { yieldWanted: 0.9, confidence: 0.95, start: 0.02, most: 10 };

/** A search over chips that fail above a value of their own, as common random numbers make them. */
function searchOver(
  breakingValues: Float64Array,
  search: Partial<ToleranceSearch> = {},
): Promise<ToleranceEstimate> {
  const trials = breakingValues.length;
  const count = (value: number): Promise<YieldCount> =>
    Promise.resolve({ passed: breakingValues.filter((breaking) => breaking > value).length, trials });
  return findTolerance({ ...USUAL, count, ...search });
}

/** The share of good chips falls as exp(-v), so that the yield 0.9 holds up to -log 0.9. */
const TRUTH = -Math.log(0.9);
const exactQuantiles = (trials: number): Float64Array =>
  Float64Array.from({ length: trials }, (_, k) => -Math.log((k + 0.5) / trials));

describe('the largest value for which a yield holds', () => {
  it.each([1e-6, 0.02, TRUTH, 3, 10])('is the root of the share, from the start %f', async (start) => {
    const { value, low, high } = await searchOver(exactQuantiles(20_000), { start });
    expect(Math.abs(value / TRUTH - 1)).toBeLessThan(1.5e-3);
    expect(low).toBeLessThan(value);
    expect(high).toBeGreaterThan(value);
  });

  it('is found to the precision asked for', async () => {
    const { value } = await searchOver(exactQuantiles(200_000), { precision: 1e-5 });
    expect(Math.abs(value / TRUTH - 1)).toBeLessThan(5e-5);
  });

  it('has ends at which the ends of the interval of Clopper and Pearson pass the yield', async () => {
    const breaking = exactQuantiles(1000);
    const { low, high } = await searchOver(breaking, { precision: 1e-6 });
    const intervalAt = (value: number): { low: number; high: number } =>
      clopperPearson(breaking.filter((each) => each > value).length, 1000, 0.95);
    expect(intervalAt(low * (1 - 2e-6)).low).toBeGreaterThanOrEqual(0.9);
    expect(intervalAt(low * (1 + 2e-6)).low).toBeLessThan(0.9);
    expect(intervalAt(high * (1 - 2e-6)).high).toBeGreaterThanOrEqual(0.9);
    expect(intervalAt(high * (1 + 2e-6)).high).toBeLessThan(0.9);
  });

  it('lists every value that was tried once, rising, with falling counts', async () => {
    const calls: number[] = [];
    const breaking = exactQuantiles(500);
    const estimate = await searchOver(breaking, {
      count: (value) => {
        calls.push(value);
        return Promise.resolve({ passed: breaking.filter((each) => each > value).length, trials: 500 });
      },
    });
    const values = estimate.tried.map(({ value }) => value);
    expect(values).toEqual([...calls].sort((a, b) => a - b));
    expect(new Set(values).size).toBe(values.length);
    estimate.tried.forEach(({ value, passed, trials }, k) => {
      expect(passed).toBe(breaking.filter((each) => each > value).length);
      expect(trials).toBe(500);
      if (k > 0) expect(passed).toBeLessThanOrEqual(estimate.tried[k - 1]!.passed);
    });
  });

  it('is 0 when no chip is ever good', async () => {
    const { value, low, high } = await searchOver(new Float64Array(100).fill(-1));
    expect([value, low, high]).toEqual([0, 0, 0]);
  });

  it('is Infinity when all chips always are, and nothing beyond the largest value is tried', async () => {
    const { value, low, high, tried } = await searchOver(new Float64Array(100).fill(Infinity));
    expect([value, low, high]).toEqual([Infinity, Infinity, Infinity]);
    expect(tried.at(-1)!.value).toBe(USUAL.most);
  });

  it('has an open end where so few trials prove nothing', async () => {
    // 10 of 10 leave a share of 0.69 possible: no value is safe. 7 of 10 leave 0.93 possible.
    const { value, low, high } = await searchOver(
      Float64Array.from({ length: 10 }, (_, k) => (k < 7 ? Infinity : k)),
    );
    expect(low).toBe(0);
    expect(Math.abs(value - 8)).toBeLessThan(0.01);
    expect(high).toBe(Infinity);
  });

  // Clopper and Pearson's interval covers with at least the stated confidence, whatever the share; 4 standard
  // errors of 400 experiments.
  it('lies in its interval as often as the confidence says', async () => {
    const experiments = 400;
    let covered = 0;
    for (let experiment = 0; experiment < experiments; experiment++) {
      const stream = randomStream(1, 900, experiment);
      const breaking = Float64Array.from({ length: 200 }, () => -Math.log(1 - stream.uniform()));
      const { low, high } = await searchOver(breaking);
      if (low <= TRUTH && TRUTH <= high) covered++;
    }
    expect(covered / experiments).toBeGreaterThan(0.95 - 4 * Math.sqrt((0.95 * 0.05) / experiments));
    // Nor is it so wide that it never misses.
    expect(covered).toBeLessThan(experiments);
  });
});

describe('the fewest bits with which a yield holds', () => {
  /** Chips that are good from a number of bits of their own on. */
  const search = (needed: readonly number[], most = 24): Promise<ToleranceEstimate> =>
    findFewestBits({
      yieldWanted: 0.9,
      confidence: 0.95,
      most,
      count: (bits) =>
        Promise.resolve({ passed: needed.filter((own) => own <= bits).length, trials: needed.length }),
    });

  it('are found wherever they lie, with an interval around them', async () => {
    for (let bits = 1; bits <= 24; bits++) {
      // 95 % of the chips need so many, the others one more.
      const { value, low, high } = await search(
        Array.from({ length: 2000 }, (_, k) => (k % 20 === 0 ? bits + 1 : bits)),
      );
      expect([low, value, high]).toEqual([bits, bits, bits]);
    }
  });

  it('are uncertain where the share is near the yield that is wanted', async () => {
    // 90.5 % of 200 chips: the interval by Clopper and Pearson reaches below 90 %.
    const needed = Array.from({ length: 200 }, (_, k) => (k < 181 ? 6 : 9));
    const { value, low, high } = await search(needed);
    expect([low, value, high]).toEqual([6, 6, 9]);
  });

  it('are none where not even the most are enough', async () => {
    expect((await search([30, 30, 30])).value).toBe(Infinity);
  });
});
