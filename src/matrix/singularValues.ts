import type { ComplexMatrix } from './ComplexMatrix.js';
import { identityMatrix, zeroMatrix } from './ComplexMatrix.js';
import { adjoint, multiply } from './products.js';
import { normaliseInPlace, projectOutInPlace } from './projectOut.js';

/** matrix = left diag(singularValues) right^dagger; for a matrix of m x n with k the smaller of the two: */
export interface SingularValueDecomposition {
  /** m x k, orthonormal columns. */
  readonly left: ComplexMatrix;
  /** The k singular values, falling, >= 0. */
  readonly singularValues: Float64Array;
  /** n x k, orthonormal columns. */
  readonly right: ComplexMatrix;
}

/** matrix = unitary times a positive semidefinite matrix with these eigenvalues. */
export interface PolarDecomposition {
  /** The nearest unitary matrix. */
  readonly unitary: ComplexMatrix;
  /**
   * Falling, >= 0. The matrix is sqrt(sum (s - 1)^2) from `unitary` in Frobenius norm, max |s - 1| in
   * spectral norm.
   */
  readonly singularValues: Float64Array;
}

/** Jacobi converges quadratically; this only bounds what rounding noise at the tolerance could prolong. */
const MOST_SWEEPS = 60;

/**
 * Singular values and vectors of a complex matrix of any shape.
 *
 * One-sided Jacobi (Hestenes, J. SIAM 6, 51 (1958)) with de Rijk's pivoting (SIAM J. Sci. Stat. Comput. 10,
 * 359 (1989)): pairs of rows are rotated until all rows are orthogonal to rounding; their lengths are then
 * the singular values, the rotations the left vectors, the rows themselves the right ones. Small singular
 * values keep the relative accuracy that rows of different scale allow (Demmel and Veselic, SIAM J. Matrix
 * Anal. Appl. 13, 1204 (1992)). A singular value below 1e-150 of the largest entry may come out as 0; the
 * vectors of zeros complete an orthonormal set.
 *
 * Cost for n x n: 4 n^3 when the matrix is unitary already, up to 32 n^3 more for each sweep that rotates.
 *
 * @throws RangeError when an entry is not finite
 */
export function singularValueDecomposition(matrix: ComplexMatrix): SingularValueDecomposition {
  if (matrix.rows > matrix.columns) {
    const { left, singularValues, right } = singularValueDecomposition(adjoint(matrix));
    return { left: right, singularValues, right: left };
  }
  const { rows: count, columns } = matrix;
  const scale = largestPart(matrix);
  const rows = scaledCopy(matrix, scale);
  const rotations = identityMatrix(count);
  const order = orthogonaliseRowsInPlace(rows, rotations);
  const leftAdjoint = inOrder(rotations, order);
  const rightAdjoint = inOrder(rows, order);
  const values = new Float64Array(count);
  for (let row = 0; row < count; row++) {
    values[row] = normaliseInPlace(rightAdjoint.re, rightAdjoint.im, row * columns, columns);
    if (values[row] === 0) appendOrthonormalRowInPlace(rightAdjoint, row);
    values[row]! *= scale;
  }
  return { left: adjoint(leftAdjoint), singularValues: values, right: adjoint(rightAdjoint) };
}

/**
 * The singular values alone, falling. As `singularValueDecomposition`, at half the cost. @throws
 * RangeError as there
 */
export function singularValues(matrix: ComplexMatrix): Float64Array {
  const wide = matrix.rows > matrix.columns ? adjoint(matrix) : matrix;
  const scale = largestPart(wide);
  const rows = scaledCopy(wide, scale);
  const order = orthogonaliseRowsInPlace(rows, undefined);
  return Float64Array.from(order, (row) => scale * Math.sqrt(squaredLength(rows, row)));
}

/**
 * The unitary matrix nearest to a square one in every unitarily invariant norm: left right^dagger of the
 * singular value decomposition (Fan and Hoffman, Proc. AMS 6, 111 (1955)). Of a singular matrix it is not
 * unique; this returns one of the nearest, still unitary to rounding.
 *
 * @throws RangeError when the matrix is not square or an entry is not finite
 */
export function polarDecomposition(matrix: ComplexMatrix): PolarDecomposition {
  if (matrix.rows !== matrix.columns) {
    throw new RangeError(`the nearest unitary needs a square matrix, got ${matrix.rows} x ${matrix.columns}`);
  }
  const { left, singularValues, right } = singularValueDecomposition(matrix);
  return { unitary: multiply(left, adjoint(right)), singularValues };
}

/**
 * Rotates pairs of rows until all are orthogonal; applies the same rotations to `rotations`, which then
 * holds the unitary J of rows_after = J rows_before if it was the identity. Returns the row indices by
 * falling length.
 */
function orthogonaliseRowsInPlace(rows: ComplexMatrix, rotations: ComplexMatrix | undefined): Int32Array {
  const order = Int32Array.from({ length: rows.rows }, (_, row) => row);
  const squares = new Float64Array(rows.rows);
  for (let sweep = 0; sweep < MOST_SWEEPS; sweep++) {
    // The sweeps update the squares by differences, so these drift: afresh each time.
    for (let row = 0; row < rows.rows; row++) squares[row] = squaredLength(rows, row);
    if (!sweepInPlace(rows, rotations, order, squares)) break;
  }
  return order.sort((a, b) => squares[b]! - squares[a]!);
}

/** One sweep over all pairs; says whether any was rotated. */
function sweepInPlace(
  rows: ComplexMatrix,
  rotations: ComplexMatrix | undefined,
  order: Int32Array,
  squares: Float64Array,
): boolean {
  // Rounding in an inner product of n terms grows as sqrt(n) eps; below 4 eps lies that of the rotation
  // itself.
  const tolerance = Number.EPSILON * Math.sqrt(rows.columns + 16);
  let rotated = false;
  for (let p = 0; p < order.length - 1; p++) {
    longestFirstInPlace(order, squares, p);
    for (let q = p + 1; q < order.length; q++) {
      if (orthogonalisePairInPlace(rows, rotations, order[p]!, order[q]!, squares, tolerance)) rotated = true;
    }
  }
  return rotated;
}

/** De Rijk's pivoting: of the rows not yet met as the first of a pair, the longest comes next. */
function longestFirstInPlace(order: Int32Array, squares: Float64Array, start: number): void {
  let longest = start;
  for (let p = start + 1; p < order.length; p++) {
    if (squares[order[p]!]! > squares[order[longest]!]!) longest = p;
  }
  const row = order[longest]!;
  order[longest] = order[start]!;
  order[start] = row;
}

/**
 * Makes rows x and y orthogonal, unless they are so to `tolerance` relative to their lengths. With x .
 * conj(y) = |g| e^{i gamma}, y is turned by gamma so that the product is real, then a real rotation with
 * tan t = sign(zeta) / (|zeta| + sqrt(1 + zeta^2)), zeta = (|y|^2 - |x|^2) / 2|g|, makes it vanish (Golub
 * and Van Loan, Matrix Computations).
 */
function orthogonalisePairInPlace(
  rows: ComplexMatrix,
  rotations: ComplexMatrix | undefined,
  x: number,
  y: number,
  squares: Float64Array,
  tolerance: number,
): boolean {
  const { columns, re, im } = rows;
  const atX = x * columns;
  const atY = y * columns;
  let productRe = 0;
  let productIm = 0;
  for (let k = 0; k < columns; k++) {
    const xr = re[atX + k]!;
    const xi = im[atX + k]!;
    const yr = re[atY + k]!;
    const yi = im[atY + k]!;
    productRe += xr * yr + xi * yi;
    productIm += xi * yr - xr * yi;
  }
  const product = Math.hypot(productRe, productIm);
  if (!(product > tolerance * Math.sqrt(squares[x]!) * Math.sqrt(squares[y]!))) return false;
  const zeta = (squares[y]! - squares[x]!) / (2 * product);
  const tangent = (zeta > 0 ? 1 : -1) / (Math.abs(zeta) + Math.hypot(1, zeta));
  // 1 / secant is rounded upwards more often than not at small angles, and thousands of rotations would add
  // that up.
  const secant = Math.sqrt(1 + tangent * tangent);
  const cosine = 1 - (tangent * tangent) / (secant * (secant + 1));
  const sine = tangent * cosine;
  const turnRe = productRe / product;
  const turnIm = productIm / product;
  rotateRowsInPlace(rows, x, y, cosine, sine, turnRe, turnIm);
  if (rotations) rotateRowsInPlace(rotations, x, y, cosine, sine, turnRe, turnIm);
  squares[x]! -= tangent * product;
  squares[y] = Math.max(0, squares[y]! + tangent * product);
  return true;
}

/** With y' = turn y: x becomes cosine x - sine y', y becomes sine x + cosine y'. */
function rotateRowsInPlace(
  { columns, re, im }: ComplexMatrix,
  x: number,
  y: number,
  cosine: number,
  sine: number,
  turnRe: number,
  turnIm: number,
): void {
  const atX = x * columns;
  const atY = y * columns;
  for (let k = 0; k < columns; k++) {
    const xr = re[atX + k]!;
    const xi = im[atX + k]!;
    const yr = turnRe * re[atY + k]! - turnIm * im[atY + k]!;
    const yi = turnRe * im[atY + k]! + turnIm * re[atY + k]!;
    re[atX + k] = cosine * xr - sine * yr;
    im[atX + k] = cosine * xi - sine * yi;
    re[atY + k] = sine * xr + cosine * yr;
    im[atY + k] = sine * xi + cosine * yi;
  }
}

/**
 * Fills a row so that it completes the rows above it, which are orthonormal and fewer than the columns. It
 * starts from the unit vector that lies farthest outside their span: at least sqrt(1 - rows/columns) of it
 * does.
 */
function appendOrthonormalRowInPlace({ columns, re, im }: ComplexMatrix, row: number): void {
  const inside = new Float64Array(columns);
  for (let k = 0; k < row * columns; k++) inside[k % columns]! += re[k]! ** 2 + im[k]! ** 2;
  const farthest = inside.indexOf(inside.reduce((least, share) => Math.min(least, share), Infinity));
  const at = row * columns;
  re[at + farthest] = 1;
  for (let pass = 0; pass < 2; pass++) {
    projectOutInPlace(re, im, at, re, im, row, columns);
    normaliseInPlace(re, im, at, columns);
  }
}

function inOrder({ rows, columns, re, im }: ComplexMatrix, order: Int32Array): ComplexMatrix {
  const result = zeroMatrix(rows, columns);
  order.forEach((from, to) => {
    result.re.set(re.subarray(from * columns, (from + 1) * columns), to * columns);
    result.im.set(im.subarray(from * columns, (from + 1) * columns), to * columns);
  });
  return result;
}

function squaredLength({ columns, re, im }: ComplexMatrix, row: number): number {
  let square = 0;
  for (let k = row * columns; k < (row + 1) * columns; k++) square += re[k]! * re[k]! + im[k]! * im[k]!;
  return square;
}

/**
 * Squares of very large or small entries would leave the range of a double: the work is done on entries up
 * to 1.
 */
function scaledCopy({ rows, columns, re, im }: ComplexMatrix, scale: number): ComplexMatrix {
  return { rows, columns, re: re.map((value) => value / scale), im: im.map((value) => value / scale) };
}

/** The largest |re| or |im|, 1 for a matrix of zeros. */
function largestPart({ columns, re, im }: ComplexMatrix): number {
  let largest = 0;
  for (let k = 0; k < re.length; k++) {
    if (!(Number.isFinite(re[k]) && Number.isFinite(im[k]))) {
      const place = `row ${Math.floor(k / columns) + 1}, column ${(k % columns) + 1}`;
      throw new RangeError(`singular values need finite entries; that in ${place} is not`);
    }
    largest = Math.max(largest, Math.abs(re[k]!), Math.abs(im[k]!));
  }
  return largest === 0 ? 1 : largest;
}
