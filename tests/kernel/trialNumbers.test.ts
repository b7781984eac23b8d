import { describe, expect, it } from 'vitest';
import type { KernelInstance } from '../../src/kernel/loadKernels.js';
import { loadKernels } from '../../src/kernel/loadKernels.js';
import { twinInstance } from '../../src/kernel/twins.js';
import { philox4x32 } from '../../src/random/philox.js';
import { kolmogorovTest } from '../../src/statistics/kolmogorov.js';
import { layersIn } from '../support/ziggurat.js';
import { normalCdf } from '../../src/statistics/normalDistribution.js';

type Fill = 'fillNormals' | 'fillUniforms';

/** `count` numbers of trials `trial` and `trial + 1`, the two lanes in turn. */
function draw(fill: Fill, count: number, { seed = 7, stream = 4, trial = 0 } = {}): Float64Array {
  const instance = loadKernels();
  const state = instance.reserve(4);
  const out = instance.reserve(2 * count);
  const layers = layersIn(instance);
  instance.kernels.seedTrials(state, seed, 0, stream, trial);
  instance.kernels[fill](out, count, state, layers);
  return instance.doubles(out, 2 * count);
}

/** Every second number, from the first or the second on: one lane. */
const laneOf = (numbers: Float64Array, lane: number): Float64Array =>
  numbers.filter((_, k) => k % 2 === lane);

/**
 * Mean of the products of two samples' numbers, in units of its standard error for independent numbers of
 * variance 1.
 */
function correlationInErrors(a: Float64Array, b: Float64Array): number {
  const count = Math.min(a.length, b.length);
  let sum = 0;
  for (let k = 0; k < count; k++) sum += a[k]! * b[k]!;
  return sum / Math.sqrt(count);
}

describe.each<[string, () => KernelInstance]>([
  ['compiled kernel', loadKernels],
  ['twin', twinInstance],
])('the start of a trial, %s', (_, make) => {
  // Salmon, Moraes, Dror, Shaw, SC'11: the answer for zero counter and key, known from the authors' test
  // vectors (from memory).
  it('is the known answer of Philox4x32-10 for zeros', () => {
    const instance = make();
    const state = instance.reserve(4);
    instance.kernels.seedTrials(state, 0, 0, 0, 0);
    const words = instance.integers(state, 8);
    expect([words[0]!, words[1]!, words[4]!, words[5]!].map((word) => (word >>> 0).toString(16))).toEqual([
      '6627e8d5',
      'e169c58d',
      'bc57ac4c',
      '9b00dbd8',
    ]);
  });

  it('is what the readable generator gives for the seed, the stream and the trial', () => {
    const instance = make();
    const state = instance.reserve(4);
    const words = instance.integers(state, 8);
    for (const [seedLow, seedHigh, stream, trial] of [
      [1, 0, 0, 0],
      [0, 1, 0, 0],
      [0, 0, 1, 0],
      [0, 0, 0, 1],
      [0xffffffff, 0xffffffff, 0xffffffff, 0xffffffff],
      [0x243f6a88, 0x85a308d3, 8, 123456],
    ] as const) {
      const expected = new Uint32Array(4);
      philox4x32(new Uint32Array([0, 0, trial, stream]), new Uint32Array([seedLow, seedHigh]), expected);
      // The second lane holds the trial behind the first one.
      instance.kernels.seedTrials(state, seedLow, seedHigh, stream, trial - 1);
      expect([words[2]!, words[3]!, words[6]!, words[7]!].map((word) => word >>> 0)).toEqual(
        Array.from(expected),
      );
    }
  });
});

describe('xoroshiro128+', () => {
  // Blackman and Vigna, ACM Trans. Math. Softw. 47, 36 (2021), section 3, with the constants 24, 16, 37,
  // written out in whole numbers.
  it('gives the bits of its definition', () => {
    const mask = 2n ** 64n - 1n;
    const rotate = (x: bigint, by: bigint): bigint => ((x << by) | (x >> (64n - by))) & mask;
    const instance = loadKernels();
    const state = instance.reserve(4);
    const out = instance.reserve(2 * 100);
    instance.kernels.seedTrials(state, 1, 2, 3, 4);
    const words = new BigUint64Array(instance.doubles(state, 4).slice().buffer);
    instance.kernels.fillUniforms(out, 100, state);
    const found = instance.doubles(out, 200);
    for (const lane of [0, 1]) {
      let [s0, s1] = [words[lane]!, words[2 + lane]!];
      for (let k = 0; k < 100; k++) {
        const share = Number(((s0 + s1) & mask) >> 12n) / 2 ** 52;
        expect(found[2 * k + lane]).toBeCloseTo(Math.sqrt(12) * (share - 0.5), 14);
        s1 ^= s0;
        s0 = rotate(s0, 24n) ^ s1 ^ ((s1 << 16n) & mask);
        s1 = rotate(s1, 37n);
      }
    }
  });
});

/**
 * Checks the first moments of numbers against those of a distribution, to 4 standard errors: the error of the
 * k-th has the variance (m_2k - m_k^2)/n.
 */
function expectMoments(numbers: Float64Array, moments: readonly number[]): void {
  for (let order = 1; order <= 4; order++) {
    let sum = 0;
    for (const number of numbers) sum += number ** order;
    const expected = moments[order]!;
    const standardError = Math.sqrt((moments[2 * order]! - expected ** 2) / numbers.length);
    expect(Math.abs(sum / numbers.length - expected), `moment ${order}`).toBeLessThan(4 * standardError);
  }
}

describe('normals', () => {
  it('have the moments 0, 1, 0, 3', () => {
    // Moments of the normal distribution: 1, 3, 15, 105 for the even orders.
    expectMoments(draw('fillNormals', 500_000), [1, 0, 1, 0, 3, 0, 15, 0, 105]);
  });

  it('lie beyond 3, 4 and 5 standard deviations as often as they must, on both sides', () => {
    const numbers = draw('fillNormals', 4_000_000);
    const counts = new Float64Array(6);
    for (const number of numbers) {
      if (Math.abs(number) > 3) {
        for (let k = 3; k <= 5; k++) if (Math.abs(number) > k) counts[number > 0 ? k - 3 : k]!++;
      }
    }
    [3, 4, 5, 3, 4, 5].forEach((sigmas, k) => {
      const expected = normalCdf(-sigmas) * numbers.length;
      expect(Math.abs(counts[k]! - expected), `${sigmas} sigma`).toBeLessThan(4 * Math.sqrt(expected));
    });
  });

  // 4 standard errors of a normal are a probability of 6e-5.
  it('pass the test of Kolmogorov and Smirnov, in both lanes and both places of a pair', () => {
    const numbers = draw('fillNormals', 100_000, { trial: 10 });
    for (const lane of [0, 1]) {
      const lanes = laneOf(numbers, lane);
      for (const place of [0, 1]) {
        const values = lanes.filter((_, k) => k % 2 === place);
        expect(kolmogorovTest(values, normalCdf).pValue).toBeGreaterThan(6e-5);
      }
    }
  });

  it('are the same for the same trial in either lane', () => {
    const [even, odd] = [draw('fillNormals', 1000, { trial: 4 }), draw('fillNormals', 1000, { trial: 5 })];
    expect(laneOf(even, 1)).toEqual(laneOf(odd, 0));
  });
});

describe('uniforms', () => {
  it('have the moments 0, 1, 0, 9/5', () => {
    // (sqrt 3)^k/(k + 1) for even k.
    const moments = Array.from({ length: 9 }, (_, k) => (k % 2 === 0 ? 3 ** (k / 2) / (k + 1) : 0));
    expectMoments(draw('fillUniforms', 500_000), moments);
  });

  it('pass the test of Kolmogorov and Smirnov, within their ends', () => {
    const numbers = draw('fillUniforms', 100_000, { trial: 10 });
    const root = Math.sqrt(3);
    expect(numbers.every((number) => number >= -root && number < root)).toBe(true);
    for (const lane of [0, 1]) {
      const { pValue } = kolmogorovTest(laneOf(numbers, lane), (x) => (x / root + 1) / 2);
      expect(pValue).toBeGreaterThan(6e-5);
    }
  });
});

describe.each<[Fill]>([['fillNormals'], ['fillUniforms']])('numbers of %s', (fill) => {
  const count = 100_000;
  const start = { seed: 7, stream: 4, trial: 100 };
  const first = laneOf(draw(fill, count, start), 0);
  const others: readonly (readonly [string, Float64Array])[] = [
    ['the other lane', laneOf(draw(fill, count, start), 1)],
    ['a later trial', laneOf(draw(fill, count, { ...start, trial: 102 }), 0)],
    ['another stream', laneOf(draw(fill, count, { ...start, stream: 5 }), 0)],
    ['another seed', laneOf(draw(fill, count, { ...start, seed: 8 }), 0)],
    ['the next number', first.subarray(1)],
    ['the next but one', first.subarray(2)],
    ['the seventeenth', first.subarray(17)],
  ];

  it.each(others)(
    'are independent of those of %s: neither they nor their squares are correlated',
    (_, other) => {
      expect(Math.abs(correlationInErrors(first, other))).toBeLessThan(4);
      // Squares less their mean 1; their variance is 2 for normals, 4/5 for uniforms.
      const excess = (numbers: Float64Array): Float64Array =>
        numbers.map((x) => (x * x - 1) / Math.sqrt(fill === 'fillNormals' ? 2 : 0.8));
      expect(Math.abs(correlationInErrors(excess(first), excess(other)))).toBeLessThan(4);
    },
  );

  it('have starts that are independent from trial to trial', () => {
    const instance = loadKernels();
    const state = instance.reserve(4);
    const out = instance.reserve(4);
    const layers = layersIn(instance);
    const view = instance.doubles(out, 4);
    const firsts = Float64Array.from({ length: 20_000 }, (_, trial) => {
      instance.kernels.seedTrials(state, 7, 0, 4, 2 * (trial >> 1));
      instance.kernels[fill](out, 2, state, layers);
      return view[trial % 2]!;
    });
    const distribution = fill === 'fillNormals' ? normalCdf : (x: number) => (x / Math.sqrt(3) + 1) / 2;
    expect(kolmogorovTest(firsts, distribution).pValue).toBeGreaterThan(6e-5);
    expect(Math.abs(correlationInErrors(firsts, firsts.subarray(1)))).toBeLessThan(4);
  });
});

describe('correlated grids', () => {
  // The covariance asked for is exp(-|dc|/L) exp(-|dr|/(2L)): a product, hence positive definite, with
  // variance 1 at every place. A product of two normals of correlation r has the variance 1 + r^2.
  it('have the covariance exp(-(dc + dr/2)/L) between any two places, variance 1 included', () => {
    const [columns, rows, length, samples] = [3, 4, 1.7, 20_000];
    const places = columns * rows;
    const instance = loadKernels();
    const state = instance.reserve(4);
    const grid = instance.reserve(2 * places);
    const layers = layersIn(instance);
    const view = instance.doubles(grid, 2 * places);
    const sums = new Float64Array(places * places);
    for (let trial = 0; trial < samples; trial += 2) {
      instance.kernels.seedTrials(state, 7, 0, 4, trial);
      instance.kernels.fillNormals(grid, places, state, layers);
      instance.kernels.correlateGrid(grid, columns, rows, Math.exp(-1 / length), Math.exp(-1 / (2 * length)));
      for (let a = 0; a < places; a++) {
        for (let b = 0; b <= a; b++) {
          sums[a * places + b]! += view[2 * a]! * view[2 * b]! + view[2 * a + 1]! * view[2 * b + 1]!;
        }
      }
    }
    for (let a = 0; a < places; a++) {
      for (let b = 0; b <= a; b++) {
        const dc = Math.abs(Math.floor(a / rows) - Math.floor(b / rows));
        const dr = Math.abs((a % rows) - (b % rows));
        const expected = Math.exp(-(dc + dr / 2) / length);
        const standardError = Math.sqrt((1 + expected ** 2) / samples);
        const found = sums[a * places + b]! / samples;
        expect(Math.abs(found - expected), `places ${a}, ${b}`).toBeLessThan(4 * standardError);
      }
    }
  });

  it.each([-1, -0.6, 0, 0.3, 1])('pairs have the correlation %f and keep their variances', (correlation) => {
    const instance = loadKernels();
    const pairs = 50_000;
    const state = instance.reserve(4);
    const numbers = instance.reserve(4 * pairs);
    const layers = layersIn(instance);
    instance.kernels.seedTrials(state, 7, 0, 4, 0);
    instance.kernels.fillNormals(numbers, 2 * pairs, state, layers);
    const view = instance.doubles(numbers, 4 * pairs);
    const before = view.slice();
    instance.kernels.correlatePairs(numbers, pairs, correlation);
    for (const lane of [0, 1]) {
      const first = view.filter((_, k) => k % 4 === lane);
      const second = view.filter((_, k) => k % 4 === 2 + lane);
      expect(first).toEqual(before.filter((_, k) => k % 4 === lane));
      expectMoments(second, [1, 0, 1, 0, 3, 0, 15, 0, 105]);
      let sum = 0;
      for (let k = 0; k < pairs; k++) sum += first[k]! * second[k]!;
      const standardError = Math.sqrt((1 + correlation ** 2) / pairs);
      expect(Math.abs(sum / pairs - correlation)).toBeLessThan(4 * standardError);
      if (Math.abs(correlation) === 1) {
        expect(second.every((value, k) => value === correlation * first[k]!)).toBe(true);
      }
    }
  });
});
