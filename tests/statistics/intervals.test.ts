import { describe, expect, it } from 'vitest';
import { binomialCdf } from '../../src/statistics/binomialDistribution.js';
import { clopperPearson, wilson } from '../../src/statistics/binomialInterval.js';
import { quantileWithInterval, sortedQuantile } from '../../src/statistics/quantiles.js';

/** Successes, trials, Clopper and Pearson's ends, Wilson's ends, at 95 %. */
// 81/263 and 0/20 are the worked examples of R. G. Newcombe, Stat. Med. 17, 857 (1998) (cited from memory);
// all computed with SciPy besides.
const KNOWN = [
  [0, 10, 0, 0.308497, 0, 0.277533],
  [1, 10, 0.002529, 0.445016, 0.017876, 0.40415],
  [5, 10, 0.187086, 0.812914, 0.236593, 0.763407],
  [10, 10, 0.691503, 1, 0.722467, 1],
  [81, 263, 0.252737, 0.367622, 0.255289, 0.36621],
  [0, 20, 0, 0.168433, 0, 0.161125],
] as const;

describe('binomial intervals', () => {
  it('are those of the textbooks', () => {
    for (const [successes, trials, exactLow, exactHigh, scoreLow, scoreHigh] of KNOWN) {
      const exact = clopperPearson(successes, trials, 0.95);
      const score = wilson(successes, trials, 0.95);
      const differences = [
        exact.low - exactLow,
        exact.high - exactHigh,
        score.low - scoreLow,
        score.high - scoreHigh,
      ];
      // Six decimals are printed.
      for (const difference of differences) expect(Math.abs(difference)).toBeLessThan(5.1e-7);
    }
  });

  it('end exactly at 0 and 1 when nothing or everything succeeds', () => {
    for (const interval of [clopperPearson, wilson]) {
      for (const trials of [1, 7, 20000]) {
        expect(interval(0, trials, 0.99).low).toBe(0);
        expect(interval(trials, trials, 0.99).high).toBe(1);
      }
    }
    // The other end has a closed form: (1 - high)^n = (1 - confidence)/2.
    for (const trials of [1, 13, 5000]) {
      const high = -Math.expm1(Math.log(0.025) / trials);
      expect(Math.abs(clopperPearson(0, trials, 0.95).high / high - 1)).toBeLessThan(1e-12);
      expect(Math.abs(clopperPearson(trials, trials, 0.95).low - (1 - high))).toBeLessThan(1e-13);
    }
  });

  it('put half of 1 - confidence on either side, also for a million trials', () => {
    for (const [successes, trials] of [
      [3, 8],
      [990_000, 1_000_000],
      [1, 1_000_000],
      [999_999, 1_000_000],
    ] as const) {
      const { low, high } = clopperPearson(successes, trials, 0.9);
      expect(binomialCdf(successes, trials, high)).toBeCloseTo(0.05, 8);
      expect(1 - binomialCdf(successes - 1, trials, low)).toBeCloseTo(0.05, 8);
    }
  });

  it('cover the true share with at least the stated confidence, whatever the share', () => {
    const trials = 20;
    const intervals = Array.from({ length: trials + 1 }, (_, k) => clopperPearson(k, trials, 0.95));
    for (let share = 0.005; share < 1; share += 0.01) {
      let covered = 0;
      intervals.forEach(({ low, high }, k) => {
        if (low <= share && share <= high) {
          covered += binomialCdf(k, trials, share) - binomialCdf(k - 1, trials, share);
        }
      });
      expect(covered).toBeGreaterThanOrEqual(0.95);
    }
  });

  it('refuse what is not a count or not a confidence', () => {
    for (const interval of [clopperPearson, wilson]) {
      for (const [successes, trials] of [
        [0, 0],
        [-1, 5],
        [6, 5],
        [1.5, 5],
        [NaN, 5],
        [1, Infinity],
      ] as const) {
        expect(() => interval(successes, trials, 0.95)).toThrow(RangeError);
      }
      for (const confidence of [0, 1, -1, NaN, 95])
        expect(() => interval(1, 2, confidence)).toThrow(RangeError);
    }
  });
});

describe('quantiles', () => {
  const ramp = (length: number): Float64Array => Float64Array.from({ length }, (_, i) => i + 1);

  it('interpolate as definition 7 of Hyndman and Fan', () => {
    // numpy.quantile([1, 2, 4, 8, 16], [0, 0.1, 0.5, 0.9, 1]), NumPy 2
    const sorted = new Float64Array([1, 2, 4, 8, 16]);
    const found = [0, 0.1, 0.5, 0.9, 1].map((probability) => sortedQuantile(sorted, probability));
    [1, 1.4, 4, 12.8, 16].forEach((wanted, i) => expect(found[i]).toBeCloseTo(wanted, 12));
  });

  it('have the order statistics of the tables around the median', () => {
    // Ranks of the 95 % interval for the median: n = 6: 1 and 6, 10: 2 and 9, 20: 6 and 15, 50: 18 and 33
    // (Dixon and Massey's table, from memory; the next test derives them).
    for (const [count, low, high] of [
      [6, 1, 6],
      [10, 2, 9],
      [20, 6, 15],
      [50, 18, 33],
    ] as const) {
      expect(quantileWithInterval(ramp(count), 0.5, 0.95)).toMatchObject({ low, high });
    }
    expect(quantileWithInterval(ramp(5), 0.5, 0.95)).toMatchObject({ low: null, high: null, value: 3 });
  });

  it('have the tightest ranks that the binomial law allows', () => {
    for (const count of [1, 4, 30, 400]) {
      for (const probability of [0, 0.05, 0.3, 0.95, 1]) {
        const { low, high } = quantileWithInterval(ramp(count), probability, 0.9);
        // The k-th value lies above the quantile when fewer than k values lie below it.
        const tooHigh = (rank: number): number => binomialCdf(rank - 1, count, probability);
        if (low !== null) expect(tooHigh(low)).toBeLessThanOrEqual(0.05);
        if ((low ?? 0) < count) expect(tooHigh((low ?? 0) + 1)).toBeGreaterThan(0.05);
        const tooLow = (rank: number): number => 1 - binomialCdf(rank - 1, count, probability);
        if (high !== null) expect(tooLow(high)).toBeLessThanOrEqual(0.05 + 1e-12);
        if ((high ?? count + 1) > 1) expect(tooLow((high ?? count + 1) - 1)).toBeGreaterThan(0.05);
      }
    }
  });

  it('refuse an empty sample and a probability that is none', () => {
    expect(() => sortedQuantile(new Float64Array(0), 0.5)).toThrow(RangeError);
    for (const probability of [-0.1, 1.1, NaN]) {
      expect(() => quantileWithInterval(ramp(3), probability, 0.95)).toThrow(RangeError);
    }
    expect(() => quantileWithInterval(ramp(3), 0.5, 1)).toThrow(RangeError);
  });
});
