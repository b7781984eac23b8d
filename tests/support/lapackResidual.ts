import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { oneNorm } from '../../src/matrix/norms.js';
import { subtract } from '../../src/matrix/products.js';

/**
 * How far a computed matrix is from its reference, in units of what rounding must cost: norm1(reference -
 * candidate) / (N eps norm1(reference)), N the number of columns, eps = 2^-52. An algorithm that is
 * backward stable stays below about 30 at every size (the threshold of LAPACK's own tests, LAPACK Working
 * Note 41). NaN when an entry is NaN, or when both matrices are zero.
 *
 * @throws RangeError when the shapes differ
 */
export function lapackResidual(reference: ComplexMatrix, candidate: ComplexMatrix): number {
  const difference = oneNorm(subtract(reference, candidate));
  return difference / (reference.columns * Number.EPSILON * oneNorm(reference));
}
