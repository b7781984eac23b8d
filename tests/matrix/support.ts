import { Matrix } from 'ml-matrix';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { randomStream } from '../../src/random/RandomStream.js';

/** Independent complex normals. */
export function normalMatrix(rows: number, columns: number, seed: number): ComplexMatrix {
  const stream = randomStream(seed, 1_000_000, rows);
  const matrix = zeroMatrix(rows, columns);
  for (let k = 0; k < rows * columns; k++) {
    matrix.re[k] = stream.normal();
    matrix.im[k] = stream.normal();
  }
  return matrix;
}

export function diagonalMatrix(values: ArrayLike<number>): ComplexMatrix {
  const matrix = zeroMatrix(values.length, values.length);
  for (let k = 0; k < values.length; k++) matrix.re[k * (values.length + 1)] = values[k]!;
  return matrix;
}

export function scaledMatrix(matrix: ComplexMatrix, factor: number): ComplexMatrix {
  return { ...matrix, re: matrix.re.map((x) => factor * x), im: matrix.im.map((x) => factor * x) };
}

/** For divisors whose inverse leaves the range of a double. */
export function dividedMatrix(matrix: ComplexMatrix, divisor: number): ComplexMatrix {
  return { ...matrix, re: matrix.re.map((x) => x / divisor), im: matrix.im.map((x) => x / divisor) };
}

/** [[A, -B], [B, A]] for A + iB: sums and products, and so singular values (each twice), carry over. */
export function realEmbedding({ rows, columns, re, im }: ComplexMatrix): Matrix {
  const real = Matrix.zeros(2 * rows, 2 * columns);
  for (let i = 0; i < rows; i++) {
    for (let j = 0; j < columns; j++) {
      const k = i * columns + j;
      real.set(i, j, re[k]!);
      real.set(rows + i, columns + j, re[k]!);
      real.set(i, columns + j, -im[k]!);
      real.set(rows + i, j, im[k]!);
    }
  }
  return real;
}

/** Largest |difference| of two matrices of one shape, NaN if there is one. */
export function largestDifference(a: ComplexMatrix, b: ComplexMatrix): number {
  if (a.rows !== b.rows || a.columns !== b.columns) return NaN;
  let largest = 0;
  for (let k = 0; k < a.re.length; k++) {
    largest = Math.max(largest, Math.hypot(a.re[k]! - b.re[k]!, a.im[k]! - b.im[k]!));
  }
  return largest;
}
