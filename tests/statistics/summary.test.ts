import { describe, expect, it } from 'vitest';
import { randomStream } from '../../src/random/RandomStream.js';
import { compensatedSum } from '../../src/statistics/compensatedSum.js';
import { kolmogorovTail, kolmogorovTest } from '../../src/statistics/kolmogorov.js';
import { normalCdf } from '../../src/statistics/normalDistribution.js';
import { summarise } from '../../src/statistics/summary.js';

describe('compensatedSum', () => {
  it('keeps what plain addition loses', () => {
    // Neumaier's own example: the sum is 2, plain and Kahan's summation give 0.
    expect(compensatedSum(new Float64Array([1, 1e100, 1, -1e100]))).toBe(2);
    const tenths = new Float64Array(1_000_000).fill(0.1);
    expect(compensatedSum(tenths)).toBe(100_000);
    expect(compensatedSum(tenths, (value) => value * value)).toBeCloseTo(10_000, 10);
    expect(compensatedSum(new Float64Array(0))).toBe(0);
  });
});

describe('summarise', () => {
  it('agrees with a sum done by hand', () => {
    // Values 2, 4, 4, 4, 5, 5, 7, 9: mean 5, sum of squared distances 32, standard error sqrt(32/7/8).
    const summary = summarise(new Float64Array([4, 9, 2, 4, 5, 7, 4, 5]));
    expect(summary.mean).toBe(5);
    expect(summary.standardError).toBeCloseTo(Math.sqrt(32 / 56), 15);
    expect(summary.median).toBe(4.5);
    expect(summary.quantiles.map(({ probability }) => probability)).toEqual([0.05, 0.25, 0.5, 0.75, 0.95]);
    expect(summary.quantiles[1]!.value).toBe(4);
    expect(summary.worst).toEqual({ value: 2, trial: 3 });
  });

  it('counts trials from 1, and takes the first of equals, at either end', () => {
    const values = new Float64Array([3, 1, 8, 1, 8]);
    expect(summarise(values).worst).toEqual({ value: 1, trial: 2 });
    expect(summarise(values, { worst: 'greatest' }).worst).toEqual({ value: 8, trial: 3 });
    expect(summarise(new Float64Array([0, -0])).worst.trial).toBe(1);
    expect([...values]).toEqual([3, 1, 8, 1, 8]);
  });

  it('knows no standard error of a single value', () => {
    const { mean, standardError, median, quantiles } = summarise(new Float64Array([0.97]), {
      quantiles: [0.5],
    });
    expect([mean, standardError, median]).toEqual([0.97, null, 0.97]);
    expect(quantiles).toEqual([{ probability: 0.5, value: 0.97, low: null, high: null }]);
  });

  it('does not lose a small spread on a large value', () => {
    // 1 - 1e-9 (1, 2, 3): mean 1 - 2e-9, standard error 1e-9/sqrt(3); the one-pass formula gives 0 or a
    // negative number.
    const { mean, standardError } = summarise(new Float64Array([1 - 1e-9, 1 - 2e-9, 1 - 3e-9]));
    expect(1 - mean).toBeCloseTo(2e-9, 15);
    expect(standardError! * Math.sqrt(3)).toBeCloseTo(1e-9, 15);
  });

  it('has intervals that cover as often as they say, for a skew distribution', () => {
    // 400 samples of 80 exponential variables at a fixed seed; median log 2, upper twentieth log 20.
    const truths = [Math.log(2), Math.log(20)];
    const covered = [0, 0];
    for (let sample = 0; sample < 400; sample++) {
      const stream = randomStream(5, 900, sample);
      const values = Float64Array.from({ length: 80 }, () => -Math.log1p(-stream.uniform()));
      const { quantiles } = summarise(values, { quantiles: [0.5, 0.95], confidence: 0.9 });
      quantiles.forEach(({ low, high }, i) => {
        if ((low ?? -Infinity) <= truths[i]! && truths[i]! <= (high ?? Infinity)) covered[i]!++;
      });
    }
    // At least 90 %, less four standard errors of 400 draws; the ranks being whole, a few per cent more.
    for (const count of covered) expect(count / 400).toBeGreaterThan(0.9 - 4 * Math.sqrt(0.09 / 400));
    for (const count of covered) expect(count / 400).toBeLessThan(0.99);
  });

  it('takes a million values in a fraction of a second', () => {
    const values = Float64Array.from({ length: 1_000_000 }, (_, i) => ((i + 1) * 0.6180339887498949) % 1);
    const start = performance.now();
    const { mean, median } = summarise(values);
    // 0.2 s on a quiet machine.
    expect(performance.now() - start).toBeLessThan(3000);
    // The golden rotation is equidistributed.
    expect(mean).toBeCloseTo(0.5, 4);
    expect(median).toBeCloseTo(0.5, 4);
  });

  it('refuses no values, values that are not finite, and options out of range', () => {
    expect(() => summarise(new Float64Array(0))).toThrow(RangeError);
    expect(() => summarise(new Float64Array([1, NaN]))).toThrow('the value of trial 2 is NaN');
    expect(() => summarise(new Float64Array([Infinity]))).toThrow(RangeError);
    expect(() => summarise(new Float64Array([1]), { confidence: 1 })).toThrow(RangeError);
    expect(() => summarise(new Float64Array([1]), { quantiles: [NaN] })).toThrow(RangeError);
  });
});

describe('the Kolmogorov-Smirnov test', () => {
  it('has the quantiles of the published tables', () => {
    // N. Smirnov, Ann. Math. Stat. 19, 279 (1948) (from memory), and SciPy 1.17.1 scipy.special.kolmogi.
    for (const [value, tail] of [
      [1.2238, 0.1],
      [1.3581, 0.05],
      [1.6276, 0.01],
      [1.9495, 0.001],
    ] as const) {
      expect(Math.abs(kolmogorovTail(value) / tail - 1)).toBeLessThan(4e-4);
    }
  });

  it('agrees with SciPy over the whole range, and where the two series meet', () => {
    for (const [value, tail] of [
      [0.2, 0.999999999999495],
      [0.5, 0.9639452436648751],
      [0.9, 0.3927307079406543],
      [1, 0.26999967167735456],
      [1.5, 0.022217962616525127],
      [3, 3.045995948942526e-8],
    ] as const) {
      expect(Math.abs(kolmogorovTail(value) / tail - 1)).toBeLessThan(1e-13);
    }
    expect(kolmogorovTail(1 - 1e-12)).toBeCloseTo(kolmogorovTail(1), 11);
    expect([kolmogorovTail(0), kolmogorovTail(Infinity)]).toEqual([1, 0]);
    expect(() => kolmogorovTail(NaN)).toThrow(RangeError);
  });

  it('finds the distance, and nearly the exact probability for few values', () => {
    // scipy.stats.kstest([.1, .2, .35, .5, .95], 'uniform'): D = 0.3, p = 0.664 (exact)
    const { statistic, pValue } = kolmogorovTest(new Float64Array([0.95, 0.2, 0.5, 0.1, 0.35]), (x) => x);
    expect(statistic).toBeCloseTo(0.3, 14);
    expect(Math.abs(pValue - 0.664)).toBeLessThan(0.015);
  });

  it('accepts normal numbers as normal, and not as normal with another mean', () => {
    const stream = randomStream(11, 901);
    const values = Float64Array.from({ length: 20_000 }, () => stream.normal());
    expect(kolmogorovTest(values, normalCdf).pValue).toBeGreaterThan(1e-4);
    expect(kolmogorovTest(values, (x) => normalCdf(x - 0.05)).pValue).toBeLessThan(1e-6);
    expect(() => kolmogorovTest(new Float64Array(0), normalCdf)).toThrow(RangeError);
    expect(() => kolmogorovTest(new Float64Array([NaN]), normalCdf)).toThrow(RangeError);
  });
});
