import { describe, expect, it } from 'vitest';
import { philox4x32 } from '../../src/random/philox.js';
import { randomStream } from '../../src/random/RandomStream.js';
import type { RandomStream } from '../../src/random/RandomStream.js';
import { STREAMS } from '../../src/random/streams.js';

const COUNT = 200_000;

function draw(count: number, next: () => number): Float64Array {
  return Float64Array.from({ length: count }, next);
}

function uniforms(stream: RandomStream, count = COUNT): Float64Array {
  return draw(count, () => stream.uniform());
}

function normals(stream: RandomStream, count = COUNT): Float64Array {
  return draw(count, () => stream.normal());
}

function mean(values: Float64Array): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length;
}

/** Four standard errors of the mean of `count` values with this variance. */
function fourErrors(variance: number, count: number): number {
  return 4 * Math.sqrt(variance / count);
}

/** sqrt(n) times the largest distance between the share of values below x and distribution(x). */
function kolmogorov(values: Float64Array, distribution: (x: number) => number): number {
  const sorted = values.slice().sort();
  let distance = 0;
  sorted.forEach((x, k) => {
    const expected = distribution(x);
    distance = Math.max(distance, (k + 1) / sorted.length - expected, expected - k / sorted.length);
  });
  return distance * Math.sqrt(sorted.length);
}

/** Kolmogorov's quantile at 0.999 (from tables). */
const KOLMOGOROV_999 = 1.9495;

/** Normal distribution by its series (Marsaglia, J. Stat. Softw. 11, 4 (2004)). */
function normalDistribution(x: number): number {
  if (Math.abs(x) > 7) return x > 0 ? 1 : 0;
  let sum = x;
  let term = x;
  for (let k = 3; Math.abs(term) > 1e-17; k += 2) sum += term *= (x * x) / k;
  return 0.5 + (sum * Math.exp((-x * x) / 2)) / Math.sqrt(2 * Math.PI);
}

function correlation(a: Float64Array, b: Float64Array): number {
  const meanA = mean(a);
  const meanB = mean(b);
  let [ab, aa, bb] = [0, 0, 0];
  a.forEach((value, k) => {
    ab += (value - meanA) * (b[k]! - meanB);
    aa += (value - meanA) ** 2;
    bb += (b[k]! - meanB) ** 2;
  });
  return ab / Math.sqrt(aa * bb);
}

describe('uniform', () => {
  it('lies in [0, 1) and has the moments of a uniform distribution', () => {
    const values = uniforms(randomStream(1, 7));
    expect(values.every((value) => value >= 0 && value < 1)).toBe(true);
    // E x^k = 1/(k+1), Var x^k = 1/(2k+1) - 1/(k+1)^2.
    for (const k of [1, 2, 3, 4, 9]) {
      const variance = 1 / (2 * k + 1) - 1 / (k + 1) ** 2;
      const moment = mean(values.map((value) => value ** k));
      expect(Math.abs(moment - 1 / (k + 1))).toBeLessThan(fourErrors(variance, COUNT));
    }
    expect(kolmogorov(values, (x) => x)).toBeLessThan(KOLMOGOROV_999);
  });

  it('has 53 bits, each of them as often 1 as 0', () => {
    const ones = new Float64Array(53);
    const stream = randomStream(2, 7);
    const count = 20_000;
    for (let k = 0; k < count; k++) {
      const bits = BigInt(stream.uniform() * 2 ** 53);
      for (let bit = 0; bit < 53; bit++) ones[bit]! += Number((bits >> BigInt(bit)) & 1n);
    }
    for (const sum of ones) expect(Math.abs(sum / count - 0.5)).toBeLessThan(fourErrors(0.25, count));
  });

  it('is made of the blocks of Philox: seed in the key, block, trial and stream in the counter', () => {
    const stream = randomStream(3 * 2 ** 32 + 5, 11, 13);
    const out = new Uint32Array(4);
    for (let block = 0; block < 3; block++) {
      philox4x32(Uint32Array.of(block, 0, 13, 11), Uint32Array.of(5, 3), out);
      for (const [high, low] of [
        [out[0]!, out[1]!],
        [out[2]!, out[3]!],
      ] as const) {
        const bits = ((BigInt(high) >> 5n) << 26n) | (BigInt(low) >> 6n);
        expect(BigInt(stream.uniform() * 2 ** 53)).toBe(bits);
      }
    }
  });
});

describe('normal', () => {
  it('has the moments of a normal distribution', () => {
    const values = normals(randomStream(3, 7));
    // E x^k and Var x^k = E x^2k - (E x^k)^2, with E x^2k = (2k-1)!!.
    const expected: [number, number, number][] = [
      [1, 0, 1],
      [2, 1, 3 - 1],
      [3, 0, 15],
      [4, 3, 105 - 9],
      [6, 15, 10395 - 225],
    ];
    for (const [k, moment, variance] of expected) {
      const measured = mean(values.map((value) => value ** k));
      expect(Math.abs(measured - moment)).toBeLessThan(fourErrors(variance, COUNT));
    }
  });

  it('passes the test of Kolmogorov and Smirnov', () => {
    for (let seed = 0; seed < 5; seed++) {
      expect(kolmogorov(normals(randomStream(seed, 8), 50_000), normalDistribution)).toBeLessThan(
        KOLMOGOROV_999,
      );
    }
  });

  it('has the right share in its tails', () => {
    const count = 1_000_000;
    const values = normals(randomStream(4, 7), count);
    // Two-sided shares of the normal distribution, from tables; 1.959964, 2.575829 are its quantiles .975,
    // .995.
    for (const [bound, share] of [
      [1.959964, 0.05],
      [2.575829, 0.01],
      [3.090232, 0.002],
      [4, 6.334248e-5],
    ] as const) {
      const outside = values.reduce((sum, value) => sum + (Math.abs(value) > bound ? 1 : 0), 0);
      expect(Math.abs(outside / count - share)).toBeLessThan(fourErrors(share * (1 - share), count));
      const above = values.reduce((sum, value) => sum + (value > bound ? 1 : 0), 0);
      expect(Math.abs(above / count - share / 2)).toBeLessThan(fourErrors(share / 2, count));
    }
  });

  it('gives values that do not depend on those before', () => {
    const values = normals(randomStream(5, 7));
    for (const lag of [1, 2, 3]) {
      const a = values.subarray(0, COUNT - lag);
      const b = values.subarray(lag);
      expect(Math.abs(correlation(a, b))).toBeLessThan(4 / Math.sqrt(COUNT));
      // The two of a pair share a radius: their squares would be the first to correlate.
      const squares = correlation(
        a.map((x) => x * x),
        b.map((x) => x * x),
      );
      expect(Math.abs(squares)).toBeLessThan(4 / Math.sqrt(COUNT));
    }
  });
});

describe('randomStream', () => {
  it('gives the same numbers again, whatever else is drawn in between', () => {
    const first = randomStream(6, 1, 2);
    const alone = [first.normal(), first.normal(), first.normal(), first.uniform()];
    const again = randomStream(6, 1, 2);
    const other = randomStream(6, 1, 3);
    const mixed = [again, again, again].map((stream) => {
      other.normal();
      other.uniform();
      return stream.normal();
    });
    mixed.push(again.uniform());
    expect(mixed).toEqual(alone);
  });

  const count = 50_000;
  const base = (): RandomStream => randomStream(1000, 10, 100);
  it.each<[string, () => RandomStream]>([
    ['next seed', () => randomStream(1001, 10, 100)],
    ['seed that differs in its upper half', () => randomStream(1000 + 2 ** 32, 10, 100)],
    ['next stream', () => randomStream(1000, 11, 100)],
    ['next trial', () => randomStream(1000, 10, 101)],
    ['trial and stream exchanged', () => randomStream(1000, 100, 10)],
    ['trial that carries the number of the stream', () => randomStream(1000, 10)],
  ])('is independent of the %s', (_name, other) => {
    const [a, b] = [normals(base(), count), normals(other(), count)];
    expect(Math.abs(correlation(a, b))).toBeLessThan(4 / Math.sqrt(count));
    const [c, d] = [uniforms(base(), count), uniforms(other(), count)];
    expect(Math.abs(correlation(c, d))).toBeLessThan(4 / Math.sqrt(count));
    // Nor is one a shifted piece of the other.
    const seen = new Set(c);
    expect(d.some((value) => seen.has(value))).toBe(false);
  });

  it('has first numbers that are uniform over seeds, streams and trials', () => {
    const firsts: ((k: number) => number)[] = [
      (k) => randomStream(k, 0).uniform(),
      (k) => randomStream(0, k).uniform(),
      (k) => randomStream(0, 0, k).uniform(),
      (k) => randomStream(k * 2 ** 33, 0).uniform(),
    ];
    for (const first of firsts) {
      let k = 0;
      const values = draw(5000, () => first(k++));
      expect(kolmogorov(values, (x) => x)).toBeLessThan(KOLMOGOROV_999);
    }
  });

  it('takes every number of its ranges and refuses what lies outside', () => {
    expect(randomStream(Number.MAX_SAFE_INTEGER, 2 ** 32 - 1, 2 ** 32 - 1).uniform()).toBeLessThan(1);
    for (const bad of [-1, 0.5, NaN, Infinity, 2 ** 53]) {
      expect(() => randomStream(bad, 0)).toThrow(/^seed must be/);
    }
    for (const bad of [-1, 0.5, NaN, Infinity, 2 ** 32]) {
      expect(() => randomStream(0, bad)).toThrow(/^stream must be/);
      expect(() => randomStream(0, 0, bad)).toThrow(RangeError);
    }
  });

  it('has a stream of its own for each purpose', () => {
    const numbers = Object.values(STREAMS);
    expect(new Set(numbers).size).toBe(numbers.length);
  });
});
