import { SVD } from 'ml-matrix';
import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { copyMatrix, identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { frobeniusNorm, oneNorm, unitarityDefect } from '../../src/matrix/norms.js';
import { adjoint, innerProduct, multiply, subtract } from '../../src/matrix/products.js';
import { lapackResidual } from '../support/lapackResidual.js';
import {
  polarDecomposition,
  singularValueDecomposition,
  singularValues,
} from '../../src/matrix/singularValues.js';
import { spectralNorm } from '../../src/matrix/spectralNorm.js';
import {
  diagonalMatrix,
  dividedMatrix,
  largestDifference,
  normalMatrix,
  realEmbedding,
  scaledMatrix,
} from './support.js';

function withValues(values: readonly number[], seed: number): ComplexMatrix {
  const left = haarUnitary(values.length, seed);
  return multiply(multiply(left, diagonalMatrix(values)), haarUnitary(values.length, seed + 1));
}

const nearlySingular = withValues([1, 0.5, 0.25, 1e-9, 1e-13], 30);
const permutation = matrixFromRows([
  [0, 0, 1, 0],
  [1, 0, 0, 0],
  [0, 0, 0, [0, 1]],
  [0, 1, 0, 0],
]);

/** The hard cases, each met by every law below. */
const CASES: readonly (readonly [string, ComplexMatrix])[] = [
  ['one entry', matrixFromRows([[[3, -4]]])],
  ['identity', identityMatrix(5)],
  ['permutation', permutation],
  ['zeros', zeroMatrix(3, 3)],
  ['no entries', zeroMatrix(0, 0)],
  ['unitary', haarUnitary(12, 3)],
  ['multiple of a unitary', scaledMatrix(haarUnitary(9, 4), 1e-7)],
  ['normals 2 x 2', normalMatrix(2, 2, 20)],
  ['normals 7 x 7', normalMatrix(7, 7, 21)],
  ['normals 40 x 40', normalMatrix(40, 40, 22)],
  ['normals 3 x 8', normalMatrix(3, 8, 23)],
  ['normals 8 x 3', normalMatrix(8, 3, 24)],
  ['a row', normalMatrix(1, 6, 25)],
  ['a column', normalMatrix(6, 1, 26)],
  ['rank 1', multiply(normalMatrix(10, 1, 27), normalMatrix(1, 10, 28))],
  ['rank 3 of 10', multiply(normalMatrix(10, 3, 27), normalMatrix(3, 10, 28))],
  ['zero rows and columns', diagonalMatrix([0, 2, 0, 1, 0])],
  [
    'repeated rows',
    matrixFromRows([
      [1, [0, 1], 2],
      [1, [0, 1], 2],
      [1, [0, 1], 2],
    ]),
  ],
  [
    'nilpotent',
    matrixFromRows([
      [0, 1, 0],
      [0, 0, 1],
      [0, 0, 0],
    ]),
  ],
  ['nearly singular', nearlySingular],
  ['nearly unitary', withValues([1 + 1e-8, 1, 1, 1 - 1e-8, 1 - 1e-12], 31)],
  ['graded', multiply(diagonalMatrix([1, 1e-4, 1e-8, 1e-12, 1e-16]), normalMatrix(5, 5, 32))],
  ['huge', scaledMatrix(normalMatrix(4, 4, 33), 1e300)],
  ['tiny', scaledMatrix(normalMatrix(4, 4, 34), 1e-300)],
];

describe.each(CASES)('singular values of: %s', (_name, matrix) => {
  const { left, singularValues: values, right } = singularValueDecomposition(matrix);
  const size = Math.max(matrix.rows, matrix.columns);

  it('have orthonormal vectors, even for vanishing values', () => {
    // Measured: at most n eps (left), 1.02 sqrt(n + 16) eps, the tolerance of the sweeps (right).
    const bound = Number.EPSILON * (6 + 2 * size);
    expect(unitarityDefect(left)).toBeLessThan(bound);
    expect(unitarityDefect(right)).toBeLessThan(bound);
    expect([left.rows, left.columns]).toEqual([matrix.rows, values.length]);
    expect([right.rows, right.columns]).toEqual([matrix.columns, values.length]);
  });

  it('give the matrix back', () => {
    const weighted = multiply(left, diagonalMatrix(values));
    const residual = lapackResidual(matrix, multiply(weighted, adjoint(right)));
    // 0/0 for a matrix of zeros, which has to come back as it is.
    if (oneNorm(matrix) === 0) expect(residual).toBeNaN();
    else expect(residual).toBeLessThan(3);
  });

  it('fall, are not negative, and are the same without the vectors', () => {
    expect(values).toHaveLength(Math.min(matrix.rows, matrix.columns));
    values.forEach((value, k) => {
      expect(value).toBeGreaterThanOrEqual(0);
      if (k > 0) expect(value).toBeLessThanOrEqual(values[k - 1]!);
    });
    const alone = singularValues(matrix);
    expect(alone).toHaveLength(values.length);
    alone.forEach((value, k) => {
      expect(Math.abs(value - values[k]!)).toBeLessThanOrEqual(2 * Number.EPSILON * value);
    });
  });

  it('agree with those of the real embedding by ml-matrix, where each stands twice', () => {
    if (values.length === 0) return;
    // That library does not scale, and its squares would over- and underflow.
    const scale = oneNorm(matrix) || 1;
    const twice = new SVD(realEmbedding(dividedMatrix(matrix, scale)), { autoTranspose: true }).diagonal;
    twice.sort((a, b) => b - a);
    values.forEach((value, k) => {
      for (const other of [twice[2 * k]!, twice[2 * k + 1]!]) {
        expect(Math.abs(value / scale - other)).toBeLessThan(10 * size * Number.EPSILON);
      }
    });
  });

  it('have squares that add up to the square of the Frobenius norm', () => {
    const scale = oneNorm(matrix) || 1;
    const sum = values.reduce((total, value) => total + (value / scale) ** 2, 0);
    const expected = frobeniusNorm(dividedMatrix(matrix, scale)) ** 2;
    expect(Math.abs(sum - expected)).toBeLessThanOrEqual(20 * size * Number.EPSILON * expected);
  });

  it('have a largest one that is the spectral norm', () => {
    const norm = spectralNorm(matrix);
    expect(Math.abs(norm - (values[0] ?? 0))).toBeLessThanOrEqual(1e-13 * norm);
  });
});

describe('singular values', () => {
  it('of a 2 x 2 matrix are those of the closed form', () => {
    // Of [[1,1],[0,1]]: golden ratio and its inverse (squares add up to 3, product 1).
    const golden = (1 + Math.sqrt(5)) / 2;
    const values = singularValues(
      matrixFromRows([
        [1, 1],
        [0, 1],
      ]),
    );
    expect(values[0]).toBeCloseTo(golden, 14);
    expect(values[1]).toBeCloseTo(1 / golden, 14);
  });

  it('of the Hilbert matrix of order 6 give its condition number, also in disguise', () => {
    // 1.4951058642254665e7: from memory, as quoted for hilb(6) in textbooks of numerical analysis. Rounding
    // of the entries alone may change it by a share of 1.5e7 eps = 3e-9.
    const hilbert = matrixFromRows(
      Array.from({ length: 6 }, (_, i) => Array.from({ length: 6 }, (__, j) => 1 / (i + j + 1))),
    );
    const disguised = multiply(haarUnitary(6, 50), multiply(hilbert, haarUnitary(6, 51)));
    for (const matrix of [hilbert, disguised]) {
      const values = singularValues(matrix);
      expect(Math.abs(values[0]! / values[5]! / 1.4951058642254665e7 - 1)).toBeLessThan(1e-8);
    }
  });

  it('are found again in a matrix built from them', () => {
    const wanted = [1, 0.5, 0.25, 1e-9, 1e-13];
    singularValues(nearlySingular).forEach((value, k) => {
      expect(Math.abs(value - wanted[k]!)).toBeLessThan(10 * Number.EPSILON);
    });
  });

  it('keep relative accuracy over 120 orders of magnitude when the rows are graded', () => {
    const grades = Array.from({ length: 7 }, (_, k) => 10 ** (-20 * k));
    const shuffled = [3, 0, 6, 2, 5, 1, 4].map((k) => grades[k]!);
    const values = singularValues(multiply(diagonalMatrix(shuffled), haarUnitary(7, 40)));
    grades.forEach((grade, k) => expect(Math.abs(values[k]! / grade - 1)).toBeLessThan(1e-14));
  });

  it('have left vectors that thousands of rotations do not stretch', () => {
    // Measured: 0.31 to 0.45 n eps for n = 20 to 160. A cosine rounded with a bias gives 1.1 n eps.
    const { left, right } = singularValueDecomposition(normalMatrix(100, 100, 70));
    expect(unitarityDefect(left)).toBeLessThan(0.6 * 100 * Number.EPSILON);
    expect(unitarityDefect(right)).toBeLessThan(1.2 * Math.sqrt(116) * Number.EPSILON);
  });

  it('do not change under permutation, conjugation and transposition', () => {
    const matrix = normalMatrix(4, 4, 41);
    const values = singularValues(matrix);
    for (const other of [adjoint(matrix), multiply(permutation, matrix), multiply(matrix, permutation)]) {
      singularValues(other).forEach((value, k) => expect(value / values[k]!).toBeCloseTo(1, 13));
    }
  });

  it('refuse entries that are not finite, naming the place', () => {
    const bad = copyMatrix(normalMatrix(3, 3, 42));
    bad.im[5] = NaN;
    for (const act of [singularValues, singularValueDecomposition, polarDecomposition]) {
      expect(() => act(bad)).toThrow('row 2, column 3');
    }
    bad.im[5] = -Infinity;
    expect(() => singularValues(bad)).toThrow(RangeError);
  });

  it('leave the matrix as it was', () => {
    const matrix = normalMatrix(5, 5, 43);
    const copy = copyMatrix(matrix);
    singularValueDecomposition(matrix);
    singularValues(matrix);
    polarDecomposition(matrix);
    expect(matrix).toEqual(copy);
  });
});

describe('polarDecomposition', () => {
  it('finds the nearest unitary of [[1,1],[0,1]]: [[2,1],[-1,2]]/sqrt(5)', () => {
    // By hand: with P = [[2,1],[-1,2]]/sqrt(5), P^T A is symmetric and positive definite.
    const nearest = scaledMatrix(
      matrixFromRows([
        [2, 1],
        [-1, 2],
      ]),
      1 / Math.sqrt(5),
    );
    const { unitary } = polarDecomposition(
      matrixFromRows([
        [1, 1],
        [0, 1],
      ]),
    );
    expect(largestDifference(unitary, nearest)).toBeLessThan(4 * Number.EPSILON);
  });

  it.each(CASES.filter(([, { rows, columns }]) => rows === columns))('of %s is unitary', (_name, matrix) => {
    const { unitary } = polarDecomposition(matrix);
    expect(unitarityDefect(unitary)).toBeLessThan(Number.EPSILON * (8 + 3 * matrix.rows));
  });

  it.each([2, 5, 16])('leaves a positive semidefinite factor, n = %i', (modes) => {
    const matrix = normalMatrix(modes, modes, 60);
    const { unitary, singularValues: values } = polarDecomposition(matrix);
    const factor = multiply(adjoint(unitary), matrix);
    const norm = frobeniusNorm(matrix);
    expect(largestDifference(factor, adjoint(factor))).toBeLessThan(10 * Number.EPSILON * norm);
    // The trace of the factor is the sum of the singular values only if no eigenvalue is negative.
    const sum = values.reduce((total, value) => total + value, 0);
    const [re, im] = innerProduct(unitary, matrix);
    expect(Math.hypot(re - sum, im)).toBeLessThan(10 * modes * Number.EPSILON * norm);
  });

  it('is at the distances that the singular values say, and no unitary is nearer', () => {
    // Fan and Hoffman, Proc. AMS 6, 111 (1955).
    const matrix = normalMatrix(4, 4, 61);
    const { unitary, singularValues: values } = polarDecomposition(matrix);
    const difference = subtract(matrix, unitary);
    const squares = values.reduce((sum, value) => sum + (value - 1) ** 2, 0);
    const largest = values.reduce((max, value) => Math.max(max, Math.abs(value - 1)), 0);
    expect(frobeniusNorm(difference) ** 2).toBeCloseTo(squares, 12);
    expect(spectralNorm(difference)).toBeCloseTo(largest, 13);
    for (let seed = 0; seed < 100; seed++) {
      // From far away to within 1e-3 of the nearest one.
      const step = scaledMatrix(normalMatrix(4, 4, 100 + seed), 10 ** (-seed / 33));
      const other = polarDecomposition(subtract(unitary, step)).unitary;
      const toOther = subtract(matrix, other);
      expect(frobeniusNorm(toOther)).toBeGreaterThan(frobeniusNorm(difference));
      expect(spectralNorm(toOther)).toBeGreaterThanOrEqual(largest * (1 - 1e-12));
    }
  });

  it('gives a unitary matrix back, whatever it is multiplied by', () => {
    const unitary = haarUnitary(20, 62);
    for (const factor of [1, 1e-200, 3e200]) {
      const back = polarDecomposition(scaledMatrix(unitary, factor)).unitary;
      expect(largestDifference(back, unitary)).toBeLessThan(20 * Number.EPSILON);
    }
  });

  it('keeps what a singular matrix determines', () => {
    // |1><2| + 0: the vector of port 2 must go to port 1, the rest is free.
    const { unitary } = polarDecomposition(
      matrixFromRows([
        [0, [0, 2]],
        [0, 0],
      ]),
    );
    expect(Math.hypot(unitary.re[1]!, unitary.im[1]! - 1)).toBeLessThan(4 * Number.EPSILON);
    expect(unitarityDefect(unitary)).toBeLessThan(4 * Number.EPSILON);
  });

  it('refuses a matrix that is not square', () => {
    expect(() => polarDecomposition(zeroMatrix(2, 3))).toThrow(
      new RangeError('the nearest unitary needs a square matrix, got 2 x 3'),
    );
  });
});
