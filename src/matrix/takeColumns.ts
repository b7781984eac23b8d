import type { ComplexMatrix } from './ComplexMatrix.js';
import { zeroMatrix } from './ComplexMatrix.js';

/** The columns of a matrix with these indices (from 0), in their order. */
export function takeColumns(matrix: ComplexMatrix, columns: readonly number[]): ComplexMatrix {
  const taken = zeroMatrix(matrix.rows, columns.length);
  for (let row = 0; row < matrix.rows; row++) {
    columns.forEach((column, k) => {
      taken.re[row * columns.length + k] = matrix.re[row * matrix.columns + column]!;
      taken.im[row * columns.length + k] = matrix.im[row * matrix.columns + column]!;
    });
  }
  return taken;
}
