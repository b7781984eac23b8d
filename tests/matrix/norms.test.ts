import { describe, expect, it } from 'vitest';
import { identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { frobeniusNorm, oneNorm, unitarityDefect } from '../../src/matrix/norms.js';
import { adjoint, multiply, subtract } from '../../src/matrix/products.js';
import { lapackResidual } from '../support/lapackResidual.js';
import { largestDifference, normalMatrix, realEmbedding, scaledMatrix } from './support.js';

const SAMPLE = matrixFromRows([
  [
    [3, 4],
    [0, -2],
  ],
  [1, [-5, 12]],
]);

describe('frobeniusNorm and oneNorm', () => {
  it('have the values worked out by hand', () => {
    expect(frobeniusNorm(SAMPLE)).toBeCloseTo(Math.sqrt(25 + 4 + 1 + 169), 14);
    // Sums over columns: 5 + 1 and 2 + 13; over rows they would be 7 and 14.
    expect(oneNorm(SAMPLE)).toBe(15);
    expect(oneNorm(zeroMatrix(3, 3))).toBe(0);
    expect(frobeniusNorm(zeroMatrix(0, 0))).toBe(0);
  });

  it('Frobenius norm is that of the real embedding over sqrt(2), and unitary invariant', () => {
    const matrix = normalMatrix(9, 9, 11);
    const norm = frobeniusNorm(matrix);
    expect(norm / (realEmbedding(matrix).norm('frobenius') / Math.SQRT2)).toBeCloseTo(1, 14);
    expect(frobeniusNorm(multiply(haarUnitary(9, 1), matrix)) / norm).toBeCloseTo(1, 14);
  });

  it('let a NaN through', () => {
    expect(frobeniusNorm(matrixFromRows([[1, NaN]]))).toBeNaN();
    expect(oneNorm(matrixFromRows([[NaN, 1]]))).toBeNaN();
    expect(oneNorm(matrixFromRows([[1, [0, NaN]]]))).toBeNaN();
  });
});

describe('unitarityDefect', () => {
  it('is max |U^dagger U - I|, computed here by a product', () => {
    for (const [rows, columns] of [
      [1, 1],
      [2, 2],
      [7, 7],
      [3, 5],
      [5, 3],
    ] as const) {
      const matrix = normalMatrix(rows, columns, 12);
      const gram = multiply(adjoint(matrix), matrix);
      const expected = largestDifference(gram, identityMatrix(columns));
      expect(unitarityDefect(matrix) / expected).toBeCloseTo(1, 13);
    }
  });

  it('vanishes for unitaries and isometries, and only there', () => {
    const half = Math.SQRT1_2;
    const splitter = matrixFromRows([
      [half, [0, half]],
      [[0, half], half],
    ]);
    expect(unitarityDefect(splitter)).toBeLessThan(2 * Number.EPSILON);
    expect(unitarityDefect(matrixFromRows([[1], [0]]))).toBe(0);
    expect(unitarityDefect(matrixFromRows([[1, 0]]))).toBe(1);
    expect(unitarityDefect(scaledMatrix(identityMatrix(3), 2))).toBe(3);
    // A shear has columns of which one is too long, and they are not orthogonal.
    expect(
      unitarityDefect(
        matrixFromRows([
          [1, 0.5],
          [0, 1],
        ]),
      ),
    ).toBe(0.5);
  });

  it('lets NaN and Infinity through', () => {
    for (const k of [0, 1, 2, 3]) {
      const matrix = identityMatrix(2);
      matrix.im[k] = NaN;
      expect(unitarityDefect(matrix)).toBeNaN();
      matrix.im[k] = Infinity;
      expect(unitarityDefect(matrix)).not.toBeLessThan(1e300);
    }
  });
});

describe('lapackResidual', () => {
  it('counts in N eps norm1: one ulp in one entry of the identity on N ports is 1/N', () => {
    for (const modes of [1, 2, 10]) {
      const candidate = identityMatrix(modes);
      candidate.re[0]! += Number.EPSILON;
      expect(lapackResidual(identityMatrix(modes), candidate)).toBe(1 / modes);
    }
  });

  it('does not change when both matrices are scaled, and is 0 for equal ones', () => {
    const reference = normalMatrix(6, 6, 13);
    const candidate = subtract(reference, scaledMatrix(normalMatrix(6, 6, 14), 1e-14));
    const residual = lapackResidual(reference, candidate);
    expect(residual).toBeGreaterThan(1);
    const scaled = lapackResidual(scaledMatrix(reference, 2 ** -80), scaledMatrix(candidate, 2 ** -80));
    expect(scaled).toBe(residual);
    expect(lapackResidual(reference, reference)).toBe(0);
  });

  it('is NaN when an entry is, and refuses other shapes', () => {
    expect(lapackResidual(identityMatrix(2), scaledMatrix(identityMatrix(2), NaN))).toBeNaN();
    expect(() => lapackResidual(identityMatrix(2), identityMatrix(3))).toThrow(RangeError);
  });
});
