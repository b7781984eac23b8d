import { describe, expect, it } from 'vitest';
import { randomStream } from '../../src/random/RandomStream.js';
import { clopperPearson } from '../../src/statistics/binomialInterval.js';
import type {
  LadderSearch,
  ToleranceEstimate,
  ToleranceSearch,
  YieldCount,
} from '../../src/tolerance/findTolerance.js';
import {
  bracketSoFar,
  findFewestBits,
  findOnLadder,
  findTolerance,
} from '../../src/tolerance/findTolerance.js';

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
    const { outcome, value, low, high, tried } = await searchOver(new Float64Array(100).fill(-1));
    expect([outcome, value, low, high]).toEqual(['holds nowhere', 0, 0, 0]);
    // Where it begins, and where nothing means anything any more: that is enough to know.
    expect(tried).toHaveLength(2);
  });

  it('is Infinity when all chips always are, and nothing beyond the largest value is tried', async () => {
    const { outcome, ...found } = await searchOver(new Float64Array(100).fill(Infinity));
    const { value, low, high, tried } = found;
    expect([outcome, value, low, high]).toEqual(['holds everywhere', Infinity, Infinity, Infinity]);
    expect(tried.at(-1)!.value).toBe(USUAL.most);
  });

  it('is counted from where the quantity does no harm', async () => {
    const from = 0.5;
    const breaking = exactQuantiles(20_000).map((distance) => from + distance);
    const { outcome, value, low, high, tried } = await searchOver(breaking, { from });
    expect(outcome).toBe('found');
    expect(Math.abs((value - from) / TRUTH - 1)).toBeLessThan(1.5e-3);
    expect([low < value, value < high, tried[0]!.value > from]).toEqual([true, true, true]);
    const nowhere = await searchOver(new Float64Array(100).fill(-1), { from });
    expect(nowhere).toMatchObject({ outcome: 'holds nowhere', value: from, low: from, high: from });
    const everywhere = await searchOver(new Float64Array(100).fill(Infinity), { from });
    expect([everywhere.value, everywhere.tried.at(-1)!.value]).toEqual([Infinity, from + USUAL.most]);
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
    expect(await search([30, 30, 30])).toMatchObject({ outcome: 'holds nowhere', value: Infinity });
    expect(await search([1, 1, 1])).toMatchObject({ outcome: 'found', value: 1 });
  });
});

describe('how far up a ladder a yield holds', () => {
  const TRIALS = 1000;
  /** A search where the share of good chips is known at each value. */
  const climb = (
    shareAt: (value: number) => number,
    search: Partial<LadderSearch> = {},
  ): Promise<ToleranceEstimate> =>
    findOnLadder({
      yieldWanted: 0.9,
      confidence: 0.95,
      rungs: [0, 1, 2, 4, 8, 16, 32],
      count: (value) => Promise.resolve({ passed: Math.round(TRIALS * shareAt(value)), trials: TRIALS }),
      ...search,
    });
  /** Lost at 3, won again at 10. */
  const dip = (x: number): number => Math.min(1, 0.9 + (0.02 * (x - 3) * (x - 10)) / 21);

  it('is where it is lost first, though it is won again', async () => {
    const { outcome, value, low, high, tried } = await climb(dip);
    expect(outcome).toBe('found');
    // Counts are whole: 899.5 of 1000 already count as 900, at 3 + 0.0005 * 21/(0.02 * 7).
    expect(value).toBeGreaterThan(3);
    expect(value).toBeLessThan(1.002 * (3 + 0.075));
    // The dip goes down to 888 of 1000, which leave a share of 0.9 possible.
    expect(high).toBe(Infinity);
    const lowerEndAt = (x: number): number => clopperPearson(Math.round(TRIALS * dip(x)), TRIALS, 0.95).low;
    expect(low).toBeGreaterThan(0);
    expect(lowerEndAt(0.999 * low)).toBeGreaterThanOrEqual(0.9);
    expect(lowerEndAt(1.001 * low)).toBeLessThan(0.9);
    expect(tried.map((found) => found.value)).toEqual(
      expect.arrayContaining([0, 1, 2, 4, 8, 16, 32]) as number[],
    );
  });

  it('does not look beyond the rung at which all searches have failed', async () => {
    const { value, low, high, tried } = await climb((x) => (x <= 5.3 ? 1 : 0));
    for (const end of [value, low, high]) expect(Math.abs(end / 5.3 - 1)).toBeLessThan(1e-3);
    expect(tried.at(-1)!.value).toBe(8);
  });

  it('is the last whole number, where only those make sense', async () => {
    for (let last = 2; last < 16; last++) {
      const { value, low, high, tried } = await climb((x) => (x <= last ? 1 : 0), {
        rungs: [2, 3, 6, 8, 16],
        whole: true,
      });
      expect([value, low, high]).toEqual([last, last, last]);
      expect(tried.every((found) => Number.isInteger(found.value))).toBe(true);
    }
  });

  it('is nowhere when the first rung fails, and everywhere when none does', async () => {
    const nowhere = await climb((x) => (x === 2 ? 0 : 1), { rungs: [2, 3, 4] });
    expect(nowhere).toMatchObject({ outcome: 'holds nowhere', value: 0, low: 0, high: 0 });
    expect(nowhere.tried).toHaveLength(1);
    const everywhere = await climb(() => 1);
    expect(everywhere).toMatchObject({ outcome: 'holds everywhere', value: Infinity, low: Infinity });
  });

  // What the lower end of the interval proves, the share shows, and the upper end leaves possible: at each
  // value, so that the three searches never cross, however the yield goes up and down.
  it('lies between its ends, whatever the yield does', async () => {
    const stream = randomStream(1, 901);
    for (let experiment = 0; experiment < 200; experiment++) {
      const phases = Array.from({ length: 3 }, () => 10 * stream.uniform());
      const share = (x: number): number =>
        0.9 + 0.03 * phases.reduce((sum, phase) => sum + Math.sin(phase * (1 + x)), 0);
      const { value, low, high } = await climb((x) => Math.min(1, share(x)));
      expect([low <= value, value <= high]).toEqual([true, true]);
    }
  });
});

describe('the bracket so far', () => {
  const tried = (shares: Readonly<Record<number, number>>): Parameters<typeof bracketSoFar>[0] =>
    Object.entries(shares).map(([value, share]) => ({ value: Number(value), passed: share, trials: 100 }));

  it('is the two neighbours between which the yield is lost', () => {
    expect(bracketSoFar([], 0.9, true)).toEqual({});
    expect(bracketSoFar(tried({ 1: 95 }), 0.9, true)).toEqual({ holds: 1 });
    expect(bracketSoFar(tried({ 1: 80 }), 0.9, true)).toEqual({ fails: 1 });
    expect(bracketSoFar(tried({ 1: 95, 2: 90, 3: 89, 4: 10 }), 0.9, true)).toEqual({ holds: 2, fails: 3 });
    // Won again at 4: lost first between 1 and 3.
    expect(bracketSoFar(tried({ 4: 99, 1: 95, 3: 89 }), 0.9, true)).toEqual({ holds: 1, fails: 3 });
    // More bits are better.
    expect(bracketSoFar(tried({ 24: 100, 12: 95, 6: 20, 9: 60 }), 0.9, false)).toEqual({
      holds: 12,
      fails: 9,
    });
  });
});
