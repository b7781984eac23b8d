import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { unitarityDefect } from '../../src/matrix/norms.js';
import { adjoint, innerProduct, transpose } from '../../src/matrix/products.js';

/** Seeds 0..count-1: a hundred thousand small matrices would be no better a test than twenty thousand. */
function sample(modes: number, count: number): ComplexMatrix[] {
  return Array.from({ length: count }, (_, seed) => haarUnitary(modes, seed));
}

function meanOf(matrices: readonly ComplexMatrix[], value: (matrix: ComplexMatrix) => number): number {
  return matrices.reduce((sum, matrix) => sum + value(matrix), 0) / matrices.length;
}

function traceSquared({ rows, re, im }: ComplexMatrix): number {
  let [sumRe, sumIm] = [0, 0];
  for (let k = 0; k < rows; k++) {
    sumRe += re[k * (rows + 1)]!;
    sumIm += im[k * (rows + 1)]!;
  }
  return sumRe ** 2 + sumIm ** 2;
}

function power({ re, im }: ComplexMatrix, k: number): number {
  return re[k]! ** 2 + im[k]! ** 2;
}

function kolmogorov(values: number[], distribution: (x: number) => number): number {
  values.sort((a, b) => a - b);
  let distance = 0;
  values.forEach((x, k) => {
    const expected = distribution(x);
    distance = Math.max(distance, (k + 1) / values.length - expected, expected - k / values.length);
  });
  return distance * Math.sqrt(values.length);
}

/** Kolmogorov's quantile at 0.999 (from tables). */
const KOLMOGOROV_999 = 1.9495;

describe('haarUnitary', () => {
  // Measured over these sizes and seeds: at most 5 eps; the bound grows as the rounding of a sum of n terms.
  it.each([1, 2, 3, 8, 64, 300])('is unitary to rounding at n = %i', (modes) => {
    const seeds = modes < 10 ? 50 : modes < 100 ? 4 : 1;
    for (let seed = 0; seed < seeds; seed++) {
      const unitary = haarUnitary(modes, seed);
      const bound = Number.EPSILON * (4 + 2 * Math.sqrt(modes));
      expect(unitarityDefect(unitary)).toBeLessThan(bound);
      expect(unitarityDefect(adjoint(unitary))).toBeLessThan(bound);
    }
  });

  // E |Tr U|^2j = j! for j <= n (Diaconis and Shahshahani, J. Appl. Probab. 31A, 49 (1994)); in general the
  // number of permutations of j things without an increasing subsequence longer than n (Rains, Electron. J.
  // Combin. 5, R12 (1998)), for n = 2 the Catalan numbers. Moment 2j gives the variance of the power j.
  it.each([
    [2, [1, 1, 2, 5, 14, 42, 132]],
    [8, [1, 1, 2, 6, 24, 120, 720]],
  ])('has the moments of |trace|^2 at n = %i', (modes, moments) => {
    const matrices = sample(modes, 20_000);
    for (const j of [1, 2, 3]) {
      const error = Math.sqrt((moments[2 * j]! - moments[j]! ** 2) / matrices.length);
      const measured = meanOf(matrices, (matrix) => traceSquared(matrix) ** j);
      expect(Math.abs(measured - moments[j]!)).toBeLessThan(4 * error);
    }
  });

  it('gives every entry the power distribution Beta(1, n-1) and a uniform phase', () => {
    for (const modes of [2, 3, 5]) {
      const matrices = sample(modes, 4000);
      for (let k = 0; k < modes * modes; k++) {
        const powers = matrices.map((matrix) => power(matrix, k));
        expect(kolmogorov(powers, (x) => 1 - (1 - x) ** (modes - 1))).toBeLessThan(KOLMOGOROV_999);
        const turns = matrices.map(({ re, im }) => Math.atan2(im[k]!, re[k]!) / (2 * Math.PI) + 0.5);
        expect(kolmogorov(turns, (x) => x)).toBeLessThan(KOLMOGOROV_999);
      }
    }
  });

  it('has E |U_ij|^4 = 2/(n(n+1))', () => {
    for (const modes of [2, 4, 7]) {
      const matrices = sample(modes, 8000);
      // E x^k of Beta(1, n-1) is k! (n-1)! / (n+k-1)!.
      const second = 2 / (modes * (modes + 1));
      const fourth = (second * 12) / ((modes + 2) * (modes + 3));
      const error = Math.sqrt((fourth - second ** 2) / matrices.length);
      for (const k of [0, 1, modes * modes - 1]) {
        expect(Math.abs(meanOf(matrices, (matrix) => power(matrix, k) ** 2) - second)).toBeLessThan(
          4 * error,
        );
      }
    }
  });

  it('correlates entries as the measure demands: E U11 U22 conj(U12 U21) = -1/(n(n^2-1))', () => {
    // Weingarten calculus: Collins and Sniady, Commun. Math. Phys. 264, 773 (2006).
    for (const modes of [2, 3]) {
      const matrices = sample(modes, 20_000);
      const products = matrices.map(({ re, im }) => {
        const entry = (k: number): [number, number] => [re[k]!, im[k]!];
        const times = ([a, b]: [number, number], [c, d]: [number, number]): [number, number] => [
          a * c - b * d,
          a * d + b * c,
        ];
        const [ar, ai] = times(entry(0), entry(modes + 1));
        const [br, bi] = times(entry(1), entry(modes));
        return ar * br + ai * bi;
      });
      const mean = products.reduce((sum, x) => sum + x, 0) / products.length;
      const variance = products.reduce((sum, x) => sum + (x - mean) ** 2, 0) / products.length;
      const expected = -1 / (modes * (modes ** 2 - 1));
      expect(Math.abs(mean - expected)).toBeLessThan(4 * Math.sqrt(variance / products.length));
    }
  });

  it('gives the same matrix again, and unrelated ones for other seeds and sizes', () => {
    expect(haarUnitary(6, 42)).toEqual(haarUnitary(6, 42));
    // For unrelated U and V, |Tr U^dagger V|^2 is exponentially distributed with mean 1.
    let sum = 0;
    const count = 500;
    for (let seed = 0; seed < count; seed++) {
      const [re, im] = innerProduct(haarUnitary(6, seed), haarUnitary(6, seed + 1));
      sum += re ** 2 + im ** 2;
    }
    expect(Math.abs(sum / count - 1)).toBeLessThan(4 / Math.sqrt(count));
    const [small, large] = [haarUnitary(1, 3), haarUnitary(2, 3)];
    expect(Math.atan2(small.im[0]!, small.re[0]!)).not.toBeCloseTo(Math.atan2(large.im[0]!, large.re[0]!), 6);
    expect(haarUnitary(6, 2 ** 40).re).not.toEqual(haarUnitary(6, 0).re);
  });

  it('is no different from its transpose in its rows and columns', () => {
    // The rows are made one after another, the columns come of it: the last row and column must not show it.
    const matrices = sample(3, 4000);
    for (const matrix of [matrices, matrices.map(transpose)]) {
      const sums = matrix.map((m) => power(m, 6) + power(m, 7));
      // Sum of two of three powers: Beta(2, 1).
      expect(kolmogorov(sums, (x) => x ** 2)).toBeLessThan(KOLMOGOROV_999);
    }
  });

  it('refuses sizes and seeds that are not whole numbers in range', () => {
    for (const modes of [0, -1, 1.5, NaN, Infinity]) {
      expect(() => haarUnitary(modes, 1)).toThrow(/^modes must be/);
    }
    expect(() => haarUnitary(2, -1)).toThrow(/^seed must be/);
    expect(() => haarUnitary(2, 2 ** 53)).toThrow(RangeError);
  });
});
