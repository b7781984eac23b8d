import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';

/**
 * Mean over inputs j of half sum_i abs(abs(U_ij)^2 - p_ij), p the output powers of V normalised per input:
 * the total variation distance between the outputs of one photon. An input from which nothing arrives counts
 * as distance 1. In [0, 1] for a unitary U.
 * @param target U
 * @param achieved V, of the same shape
 */
export function powerDistance(target: ComplexMatrix, achieved: ComplexMatrix): number {
  const { rows, columns } = target;
  let total = 0;
  for (let input = 0; input < columns; input++) {
    let arriving = 0;
    for (let k = input; k < rows * columns; k += columns) {
      arriving += achieved.re[k]! ** 2 + achieved.im[k]! ** 2;
    }
    if (arriving === 0) {
      total += 1;
      continue;
    }
    let distance = 0;
    for (let k = input; k < rows * columns; k += columns) {
      const wanted = target.re[k]! ** 2 + target.im[k]! ** 2;
      distance += Math.abs(wanted - (achieved.re[k]! ** 2 + achieved.im[k]! ** 2) / arriving);
    }
    total += distance / 2;
  }
  return total / columns;
}
