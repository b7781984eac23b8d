import { randomStream } from '../random/RandomStream.js';
import { STREAMS } from '../random/streams.js';
import type { ComplexMatrix } from './ComplexMatrix.js';
import { normaliseInPlace, projectOutInPlace } from './projectOut.js';

/**
 * The estimate has settled when it grew by at most SETTLED_GROWTH in each of so many steps one after
 * another.
 */
const SETTLED_STEPS = 8;
const SETTLED_GROWTH = 4 * Number.EPSILON;

/**
 * The smallest number of steps after which settling counts. Up to this size the bidiagonalisation is
 * complete.
 */
const FEWEST_STEPS = 48;

/**
 * Spectral norm: the largest singular value, the longest image of a unit vector. NaN when an entry is NaN,
 * Infinity when one is infinite and none NaN, 0 for a matrix of zeros or without entries.
 *
 * Lanczos bidiagonalisation (Golub and Kahan, J. SIAM Numer. Anal. B 2, 205 (1965)) with full
 * re-orthogonalisation, from a fixed random vector, until the largest singular value of the bidiagonal
 * matrix, which can only grow, has settled. Accurate to rounding, with one exception: beyond 48 rows and
 * columns, two values at the top that agree to 8 or more digits and differ in more than rounding may not be
 * told apart, and the result lies between them.
 *
 * Cost 16 rows columns for each of the steps, 50 to 200 of them for a large matrix.
 */
export function spectralNorm(matrix: ComplexMatrix): number {
  const scale = largestPart(matrix);
  if (!(scale > 0 && scale < Infinity)) return scale;
  // Entries of at most 1 keep the squares in range.
  return (
    scale *
    largestSingularValue({
      ...matrix,
      re: matrix.re.map((value) => value / scale),
      im: matrix.im.map((value) => value / scale),
    })
  );
}

/** Orthonormal vectors, contiguous, `count` of them so far. */
interface Basis {
  readonly length: number;
  readonly re: Float64Array;
  readonly im: Float64Array;
  count: number;
}

/**
 * `inputs` spans what the steps have met of the domain, `outputs` of the image; between them the matrix is
 * bidiagonal. Its entries in the order met are the off-diagonal of a symmetric tridiagonal matrix with zero
 * diagonal, whose largest eigenvalue is the largest singular value (Golub and Kahan).
 */
function largestSingularValue(matrix: ComplexMatrix): number {
  const { rows, columns } = matrix;
  const mostSteps = Math.min(rows, columns);
  const negligible = (rows + columns) * Number.EPSILON;
  const inputs = emptyBasis(mostSteps + 1, columns);
  const outputs = emptyBasis(mostSteps, rows);
  const offDiagonal: number[] = [];
  let norm = 0;
  let settledSteps = 0;
  appendRandomInPlace(inputs);
  for (let step = 1; step <= mostSteps; step++) {
    const before = norm;
    for (const half of ['forwards', 'backwards'] as const) {
      const [from, to] = half === 'forwards' ? [inputs, outputs] : [outputs, inputs];
      if (to.count === to.length) return norm;
      if (half === 'forwards') applyInPlace(matrix, from, to);
      else applyAdjointInPlace(matrix, from, to);
      const entry = appendInPlace(to);
      offDiagonal.push(entry);
      norm = largestEigenvalue(offDiagonal, norm);
      // The vectors met span an invariant subspace, and the random start has a part along the longest image.
      if (!(entry > negligible * norm)) return norm;
    }
    settledSteps = norm <= before * (1 + SETTLED_GROWTH) ? settledSteps + 1 : 0;
    if (step >= FEWEST_STEPS && settledSteps >= SETTLED_STEPS) return norm;
  }
  return norm;
}

function emptyBasis(capacity: number, length: number): Basis {
  const size = capacity * length;
  return { length, re: new Float64Array(size), im: new Float64Array(size), count: 0 };
}

function appendRandomInPlace(basis: Basis): void {
  const stream = randomStream(0, STREAMS.spectralNormStart);
  for (let k = 0; k < basis.length; k++) {
    basis.re[k] = stream.normal();
    basis.im[k] = stream.normal();
  }
  appendInPlace(basis);
}

/**
 * Takes in the vector that stands behind the last one, made orthonormal to the others; returns its length
 * outside them.
 */
function appendInPlace(basis: Basis): number {
  const { re, im, count, length } = basis;
  const at = count * length;
  projectOutInPlace(re, im, at, re, im, count, length);
  const first = normaliseInPlace(re, im, at, length);
  projectOutInPlace(re, im, at, re, im, count, length);
  const second = normaliseInPlace(re, im, at, length);
  basis.count++;
  return first * second;
}

/** Puts matrix times the last vector of `from` behind the last one of `to`. */
function applyInPlace(matrix: ComplexMatrix, from: Basis, to: Basis): void {
  const { rows, columns, re, im } = matrix;
  const source = (from.count - 1) * columns;
  const target = to.count * rows;
  for (let i = 0; i < rows; i++) {
    const row = i * columns;
    let sumRe = 0;
    let sumIm = 0;
    for (let j = 0; j < columns; j++) {
      const ar = re[row + j]!;
      const ai = im[row + j]!;
      const vr = from.re[source + j]!;
      const vi = from.im[source + j]!;
      sumRe += ar * vr - ai * vi;
      sumIm += ar * vi + ai * vr;
    }
    to.re[target + i] = sumRe;
    to.im[target + i] = sumIm;
  }
}

/**
 * Puts matrix^dagger times the last vector of `from` behind the last one of `to`, whose place holds zeros.
 */
function applyAdjointInPlace(matrix: ComplexMatrix, from: Basis, to: Basis): void {
  const { rows, columns, re, im } = matrix;
  const source = (from.count - 1) * rows;
  const target = to.count * columns;
  for (let i = 0; i < rows; i++) {
    const row = i * columns;
    const ur = from.re[source + i]!;
    const ui = from.im[source + i]!;
    for (let j = 0; j < columns; j++) {
      const ar = re[row + j]!;
      const ai = im[row + j]!;
      to.re[target + j]! += ar * ur + ai * ui;
      to.im[target + j]! += ar * ui - ai * ur;
    }
  }
}

/**
 * Largest eigenvalue of the symmetric tridiagonal matrix with zero diagonal, known to be at least `floor`:
 * bisection on the signs of its pivots (Golub and Van Loan, Matrix Computations), to rounding.
 */
function largestEigenvalue(offDiagonal: readonly number[], floor: number): number {
  let low = offDiagonal.reduce((largest, entry) => Math.max(largest, entry), floor);
  let width = low * Number.EPSILON;
  if (isAbove(offDiagonal, low + width)) return low;
  while (width <= low && !isAbove(offDiagonal, low + 2 * width)) width *= 2;
  // The eigenvalue lies between low + width and low + 2 width.
  low += width;
  while (width > low * Number.EPSILON) {
    width /= 2;
    if (!isAbove(offDiagonal, low + width)) low += width;
  }
  return low;
}

/** Whether x exceeds all eigenvalues: x times the identity minus the matrix then has positive pivots only. */
function isAbove(offDiagonal: readonly number[], x: number): boolean {
  let pivot = x;
  for (const entry of offDiagonal) {
    if (!(pivot > 0)) return false;
    pivot = x - (entry * entry) / pivot;
  }
  return pivot > 0;
}

/** The largest |re| or |im|; NaN when there is one. */
function largestPart({ re, im }: ComplexMatrix): number {
  let largest = 0;
  for (let k = 0; k < re.length; k++) largest = Math.max(largest, Math.abs(re[k]!), Math.abs(im[k]!));
  return largest;
}
