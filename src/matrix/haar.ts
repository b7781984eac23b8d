import type { RandomStream } from '../random/RandomStream.js';
import { randomStream } from '../random/RandomStream.js';
import { STREAMS } from '../random/streams.js';
import type { ComplexMatrix } from './ComplexMatrix.js';
import { zeroMatrix } from './ComplexMatrix.js';
import { normaliseInPlace, projectOutInPlace } from './projectOut.js';

/**
 * A random unitary matrix from the Haar measure (every unitary alike). The same `modes` and `seed` give the
 * same matrix; matrices of different size or seed are independent.
 *
 * Mezzadri, Notices AMS 54, 592 (2007), arXiv:math-ph/0609050: the Q of a QR factorisation of a matrix of
 * independent complex normals is Haar distributed once the factorisation is made unique by a positive
 * diagonal of R, and in general not before. Gram-Schmidt divides by lengths, so its R has that diagonal and
 * no phases remain to be divided out. It runs here over the rows, which are contiguous: that factorises the
 * transpose, and the Haar measure is invariant under transposition.
 *
 * Each row is orthogonalised twice, so the result is unitary to rounding whatever the matrix drawn. Cost 16
 * n^3.
 *
 * @param modes whole number, at least 1
 * @param seed whole number from 0 to 2^53 - 1
 * @throws RangeError when one of them is not
 */
export function haarUnitary(modes: number, seed: number): ComplexMatrix {
  if (!(Number.isInteger(modes) && modes >= 1)) {
    throw new RangeError(`modes must be a whole number, at least 1, got ${modes}`);
  }
  return haarFromStream(modes, randomStream(seed, STREAMS.haarUnitary, modes));
}

/** The same from a stream of random numbers: another matrix with each call. */
export function haarFromStream(modes: number, stream: RandomStream): ComplexMatrix {
  const matrix = complexNormals(modes, stream);
  const { re, im } = matrix;
  for (let row = 0; row < modes; row++) {
    const at = row * modes;
    projectOutInPlace(re, im, at, re, im, row, modes);
    normaliseInPlace(re, im, at, modes);
    projectOutInPlace(re, im, at, re, im, row, modes);
    normaliseInPlace(re, im, at, modes);
  }
  return matrix;
}

function complexNormals(modes: number, stream: RandomStream): ComplexMatrix {
  const matrix = zeroMatrix(modes, modes);
  for (let k = 0; k < modes * modes; k++) {
    matrix.re[k] = stream.normal();
    matrix.im[k] = stream.normal();
  }
  return matrix;
}
