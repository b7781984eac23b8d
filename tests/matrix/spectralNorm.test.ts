import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { copyMatrix, identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { frobeniusNorm } from '../../src/matrix/norms.js';
import { adjoint, multiply, subtract } from '../../src/matrix/products.js';
import { singularValues } from '../../src/matrix/singularValues.js';
import { spectralNorm } from '../../src/matrix/spectralNorm.js';
import { diagonalMatrix, normalMatrix, scaledMatrix } from './support.js';

function relativeError(matrix: ComplexMatrix): number {
  return Math.abs(spectralNorm(matrix) / singularValues(matrix)[0]! - 1);
}

function withValues(values: readonly number[], seed: number): ComplexMatrix {
  const weighted = multiply(haarUnitary(values.length, seed), diagonalMatrix(values));
  return multiply(weighted, haarUnitary(values.length, seed + 1));
}

describe('spectralNorm', () => {
  it('is the largest singular value at all sizes from 1 to 40', () => {
    for (let size = 1; size <= 40; size++) {
      expect(relativeError(normalMatrix(size, size, 1))).toBeLessThan(1e-14);
      expect(relativeError(normalMatrix(size, 41 - size, 2))).toBeLessThan(1e-14);
    }
  });

  it('is the largest singular value beyond the size where it stops early', () => {
    expect(relativeError(normalMatrix(70, 70, 3))).toBeLessThan(1e-13);
    expect(relativeError(normalMatrix(60, 120, 4))).toBeLessThan(1e-13);
    expect(relativeError(subtract(haarUnitary(90, 5), haarUnitary(90, 6)))).toBeLessThan(1e-13);
  });

  // The values are put in by hand, so nothing but two unitaries stands between them and the answer.
  it.each([1e-3, 1e-6, 1e-9, 1e-12, 1e-15, 0])('tells top values with gaps of %d apart', (gap) => {
    for (const size of [6, 110]) {
      const pair = Array.from({ length: size }, (_, k) => (k === 0 ? 1 : k === 1 ? 1 - gap : 1 / (k + 1)));
      expect(Math.abs(spectralNorm(withValues(pair, 10)) - 1)).toBeLessThan(1e-13);
      const ladder = Array.from({ length: size }, (_, k) => 1 - gap * k);
      expect(Math.abs(spectralNorm(withValues(ladder, 12)) - 1)).toBeLessThan(1e-13);
    }
  });

  it('is exact for rank one: the product of the two lengths', () => {
    for (const size of [1, 2, 9, 80]) {
      const column = normalMatrix(size, 1, 20);
      const row = normalMatrix(1, size, 21);
      const product = frobeniusNorm(column) * frobeniusNorm(row);
      expect(Math.abs(spectralNorm(multiply(column, row)) / product - 1)).toBeLessThan(1e-14);
    }
  });

  it('is |c| for c times a unitary, and the largest modulus of a diagonal or permuted one', () => {
    for (const factor of [1, 1e-15, 7e200, 5e-324 * 2 ** 60]) {
      const scaled = scaledMatrix(haarUnitary(64, 22), factor);
      expect(Math.abs(spectralNorm(scaled) / factor - 1)).toBeLessThan(1e-13);
    }
    expect(spectralNorm(identityMatrix(100))).toBeCloseTo(1, 14);
    expect(spectralNorm(diagonalMatrix([1, -3, 2]))).toBeCloseTo(3, 14);
    expect(
      spectralNorm(
        matrixFromRows([
          [0, [3, 4]],
          [1, 0],
        ]),
      ),
    ).toBeCloseTo(5, 14);
  });

  it('of I - e^{i g} I is the chord 2 sin(g/2), down to differences of rounding size', () => {
    for (const angle of [2, 1e-3, 1e-8]) {
      const turned = haarUnitary(30, 23);
      const other = copyMatrix(turned);
      // In factored form, so that no digits are lost: U (1 - e^{i g}).
      const [cr, ci] = [2 * Math.sin(angle / 2) ** 2, -Math.sin(angle)];
      for (let k = 0; k < 900; k++) {
        other.re[k] = turned.re[k]! * cr - turned.im[k]! * ci;
        other.im[k] = turned.re[k]! * ci + turned.im[k]! * cr;
      }
      expect(Math.abs(spectralNorm(other) / (2 * Math.sin(angle / 2)) - 1)).toBeLessThan(1e-13);
    }
  });

  it('keeps relative accuracy for matrices of noise', () => {
    for (const size of [3, 20, 60]) {
      const noise = scaledMatrix(normalMatrix(size, size, 24), 1e-15);
      expect(relativeError(noise)).toBeLessThan(1e-13);
      // What rounding leaves of a unitary: few distinct values, many zeros.
      const unitary = haarUnitary(size, 25);
      const rest = subtract(multiply(unitary, adjoint(unitary)), identityMatrix(size));
      expect(relativeError(rest)).toBeLessThan(1e-10);
    }
  });

  it('is 0 for zeros, NaN or Infinity when an entry is', () => {
    expect(spectralNorm(zeroMatrix(4, 4))).toBe(0);
    expect(spectralNorm(zeroMatrix(0, 0))).toBe(0);
    for (const k of [0, 7, 15]) {
      const bad = normalMatrix(4, 4, 26);
      bad.im[k] = NaN;
      expect(spectralNorm(bad)).toBeNaN();
      bad.re[(k + 1) % 16] = Infinity;
      expect(spectralNorm(bad)).toBeNaN();
      bad.im[k] = 0;
      expect(spectralNorm(bad)).toBe(Infinity);
    }
  });

  it('finds a single large entry in a large matrix of small ones', () => {
    const matrix = scaledMatrix(normalMatrix(80, 80, 27), 1e-9);
    matrix.re[80 * 33 + 50] = 4;
    expect(relativeError(matrix)).toBeLessThan(1e-13);
  });

  it('is the same number each time', () => {
    const matrix = normalMatrix(30, 30, 28);
    expect(spectralNorm(matrix)).toBe(spectralNorm(matrix));
  });
});
