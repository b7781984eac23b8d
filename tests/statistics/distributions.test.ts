import { describe, expect, it } from 'vitest';
import { binomialCdf } from '../../src/statistics/binomialDistribution.js';
import { incompleteBeta, inverseIncompleteBeta } from '../../src/statistics/incompleteBeta.js';
import {
  complementaryErrorFunction,
  normalCdf,
  normalQuantile,
} from '../../src/statistics/normalDistribution.js';
import { logGamma, stirlingError } from '../../src/statistics/stirlingError.js';

// Values without another source: SciPy 1.17.1 (scipy.special betainc, betaincinv, erfc, ndtri, gammaln;
// scipy.stats.binom.cdf), printed with repr, that is to the last bit.

function relativeError(found: number, wanted: number): number {
  return Math.abs(found / wanted - 1);
}

describe('logGamma', () => {
  it('agrees with SciPy from 0.001 to a million', () => {
    const known = [
      [1e-3, 6.907178885383853],
      [0.5, 0.5723649429247],
      [3.3, 0.9870985778947343],
      [15.9, 27.625493215168696],
      [100, 359.1342053695754],
      [1e6, 12815504.569147611],
    ] as const;
    for (const [x, wanted] of known) expect(relativeError(logGamma(x), wanted), `${x}`).toBeLessThan(4e-15);
  });

  it('is the logarithm of a factorial, and of the square root of pi at one half', () => {
    let logFactorial = 0;
    for (let n = 1; n <= 60; n++) {
      expect(Math.abs(logGamma(n) - logFactorial)).toBeLessThan(4e-15 * (1 + logFactorial));
      logFactorial += Math.log(n);
    }
    expect(logGamma(0.5)).toBeCloseTo(0.5 * Math.log(Math.PI), 14);
    // The leading term of the series, DLMF 5.11.1
    expect(relativeError(stirlingError(1e4), 1 / 12e4)).toBeLessThan(1e-9);
  });

  it('refuses what is not positive', () => {
    for (const x of [0, -1, NaN]) expect(() => logGamma(x)).toThrow(RangeError);
  });
});

describe('the incomplete beta function', () => {
  it('agrees with SciPy from wide to needle-sharp distributions', () => {
    const known = [
      [0.3, 0.5, 0.5, 0.36901011956554536],
      [0.9, 0.1, 7, 0.999999998031793],
      [0.4, 20, 30, 0.5077001996576477],
      [0.33, 1000, 2000, 0.3506326761341843],
      [0.1236, 123456, 876545, 0.6695734285284047],
      [0.4995, 5e6, 5e6, 0.0007826992164210023],
      [0.49, 1000, 1000, 0.1855526594315119],
    ] as const;
    for (const [x, a, b, wanted] of known) {
      expect(relativeError(incompleteBeta(x, a, b), wanted), `${x} ${a} ${b}`).toBeLessThan(2e-12);
    }
  });

  it('has its closed forms: powers for a or b = 1, and the arcsine law', () => {
    for (const x of [1e-6, 0.1, 0.37, 0.5, 0.8, 0.999]) {
      for (const b of [0.3, 1, 4, 250]) {
        expect(incompleteBeta(x, 1, b)).toBeCloseTo(-Math.expm1(b * Math.log1p(-x)), 13);
        expect(incompleteBeta(x, b, 1)).toBeCloseTo(x ** b, 13);
      }
      expect(incompleteBeta(x, 0.5, 0.5)).toBeCloseTo((2 / Math.PI) * Math.asin(Math.sqrt(x)), 13);
    }
    expect([incompleteBeta(0, 2, 3), incompleteBeta(1, 2, 3)]).toEqual([0, 1]);
  });

  it('is inverted', () => {
    const known = [
      [0.025, 1, 3, 0.008403758659612636],
      [1e-10, 2, 5, 2.581997786411184e-6],
      [0.3, 0.5, 0.5, 0.2061073738537634],
      [0.975, 20, 30, 0.5376145090797704],
      [0.025, 123456, 876545, 0.12281184162962973],
      [0.9, 0.1, 7, 0.03977341233580537],
    ] as const;
    for (const [probability, a, b, wanted] of known) {
      expect(relativeError(inverseIncompleteBeta(probability, a, b), wanted)).toBeLessThan(1e-12);
    }
    for (const [a, b] of [
      [1, 1e6],
      [3, 17],
      [0.2, 0.7],
      [4e4, 6e5],
    ] as const) {
      for (const probability of [1e-12, 0.004, 0.5, 0.99]) {
        const x = inverseIncompleteBeta(probability, a, b);
        expect(relativeError(incompleteBeta(x, a, b), probability), `${a} ${b}`).toBeLessThan(1e-11);
      }
    }
    expect([inverseIncompleteBeta(0, 2, 3), inverseIncompleteBeta(1, 2, 3)]).toEqual([0, 1]);
  });

  it('refuses what makes no sense', () => {
    for (const x of [-0.1, 1.1, NaN]) {
      expect(() => incompleteBeta(x, 1, 1)).toThrow(RangeError);
      expect(() => inverseIncompleteBeta(x, 1, 1)).toThrow(RangeError);
    }
    for (const shape of [0, -1, NaN, Infinity]) {
      expect(() => incompleteBeta(0.5, shape, 1)).toThrow(RangeError);
      expect(() => inverseIncompleteBeta(0.5, 1, shape)).toThrow(RangeError);
    }
  });
});

describe('the binomial distribution', () => {
  it('agrees with SciPy and with the sum of its probabilities', () => {
    expect(binomialCdf(3, 10, 0.4)).toBeCloseTo(0.3822806016, 13);
    expect(relativeError(binomialCdf(480, 1000, 0.5), 0.10872414660207075)).toBeLessThan(1e-12);
    expect(relativeError(binomialCdf(99000, 100000, 0.99), 0.5042686879721225)).toBeLessThan(1e-11);
    let sum = 0;
    let probability = 0.7 ** 12;
    for (let k = 0; k <= 12; k++) {
      sum += probability;
      expect(binomialCdf(k, 12, 0.3)).toBeCloseTo(sum, 13);
      probability *= ((12 - k) / (k + 1)) * (0.3 / 0.7);
    }
    expect([
      binomialCdf(-1, 5, 0.5),
      binomialCdf(5, 5, 0.5),
      binomialCdf(2, 5, 0),
      binomialCdf(2, 5, 1),
    ]).toEqual([0, 1, 1, 0]);
    expect(() => binomialCdf(1.5, 3, 0.5)).toThrow(RangeError);
    expect(() => binomialCdf(1, 3, NaN)).toThrow(RangeError);
  });
});

describe('the normal distribution', () => {
  it('has an erfc of small relative error far into the tail', () => {
    const known = [
      [-3, 1.9999779095030015],
      [0.4, 0.5716076449533316],
      [0.999, 0.1577147297935031],
      [1, 0.15729920705028516],
      [2, 0.004677734981047266],
      [5, 1.5374597944280347e-12],
      [12, 1.3562611692059047e-64],
      [26, 5.663192408856145e-296],
    ] as const;
    for (const [x, wanted] of known) {
      expect(relativeError(complementaryErrorFunction(x), wanted), `${x}`).toBeLessThan(5e-15);
    }
    expect([0, Infinity, -Infinity].map(complementaryErrorFunction)).toEqual([1, 0, 2]);
    expect(complementaryErrorFunction(NaN)).toBeNaN();
  });

  it('has the quantiles of every table', () => {
    // Any textbook: the percentage points of the standard normal distribution, to six decimals.
    const table = [
      [0.9, 1.281552],
      [0.95, 1.644854],
      [0.975, 1.959964],
      [0.99, 2.326348],
      [0.995, 2.575829],
      [0.999, 3.090232],
    ] as const;
    for (const [probability, wanted] of table) {
      expect(Math.abs(normalQuantile(probability) - wanted)).toBeLessThanOrEqual(5.1e-7);
    }
  });

  it('has quantiles exact to the last digits', () => {
    const known = [
      [1e-300, -37.0470962993612],
      [1e-20, -9.262340089798409],
      [1e-4, -3.7190164854556804],
      [0.1, -1.2815515655446004],
      [0.25, -0.6744897501960817],
      [0.4, -0.2533471031357997],
      [0.499999, -2.5066282745665593e-6],
      [0.6, 0.2533471031357997],
      [0.975, 1.959963984540054],
      [0.999, 3.090232306167813],
    ] as const;
    for (const [probability, wanted] of known) {
      expect(relativeError(normalQuantile(probability), wanted), `${probability}`).toBeLessThan(5e-15);
    }
    for (let x = -37; x <= 5; x += 0.37) {
      // Above the median a probability near 1 has lost the digits of the tail.
      const tolerance = x < 0 ? 2e-14 : 1e-9;
      expect(Math.abs(normalQuantile(normalCdf(x)) - x), `${x}`).toBeLessThan(
        tolerance * Math.max(1, Math.abs(x)),
      );
    }
    expect([0, 0.5, 1].map((p) => normalQuantile(p) + 0)).toEqual([-Infinity, 0, Infinity]);
    for (const p of [-1e-9, 1.01, NaN]) expect(() => normalQuantile(p)).toThrow(RangeError);
  });
});
