import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { identityMatrix } from '../matrix/ComplexMatrix.js';
import { frobeniusNorm, unitarityDefect } from '../matrix/norms.js';
import { conjugate, subtract, transpose } from '../matrix/products.js';
import { polarDecomposition } from '../matrix/singularValues.js';
import { notFinite, requireSquare } from './limits.js';

/** Default of `unitaryWithin`: what six printed digits leave of a unitary matrix. */
export const DEFAULT_UNITARY_WITHIN = 1e-6;

/** What to do with a matrix before it is a target; without any, it is only checked. */
export interface PrepareOptions {
  /** The target is written for row vectors: take its transpose. */
  readonly transpose?: boolean;
  /** The target is written for fields that go as e^{+i omega t}: take its complex conjugate. */
  readonly conjugate?: boolean;
  /**
   * First and last port of the chip, from 1, that the target acts on; the identity elsewhere. Needs `modes`.
   */
  readonly ports?: readonly [first: number, last: number];
  /** Number of ports of the chip, where the caller knows it. */
  readonly modes?: number;
  /** Largest max |U^dagger U - I| that passes; default 1e-6. */
  readonly unitaryWithin?: number;
  /** Take the nearest unitary matrix instead of refusing. */
  readonly nearest?: boolean;
}

/** A target ready to be programmed, with what is reported of it. */
export interface PreparedTarget {
  /** What the chip shall do. */
  readonly matrix: ComplexMatrix;
  /** max |entry| of U^dagger U - I for the target that came in. */
  readonly unitarityDefect: number;
  /** Frobenius norm of the target that came in minus the unitary that was taken; null without `nearest`. */
  readonly nearestDistance: number | null;
}

/**
 * A matrix made ready as a target: transposed and conjugated as asked, its unitarity checked, the nearest
 * unitary taken when asked, placed on its ports. With `nearest` the nearest unitary U is taken also of a
 * target within the tolerance, so that the result is unitary to rounding either way: M = U H (polar
 * decomposition) minimises the norm of M - U in every unitarily invariant norm (Fan and Hoffman, Proc. AMS 6,
 * 111 (1955), DOI 10.1090/S0002-9939-1955-0067841-7). For a singular M the nearest one is not unique, and
 * none is taken. Cost n^3; with `nearest` that of a decomposition.
 * @throws InputError `target/not-unitary` with the defect, `target/singular` with the smallest singular
 * value, `target/ports`, `target/size`, `target/not-square`, `target/not-finite`, `target/unitary-within`.
 */
export function prepareTarget(matrix: ComplexMatrix, options: PrepareOptions = {}): PreparedTarget {
  requireSquare(matrix.rows, matrix.columns, Infinity);
  requirePorts(matrix.rows, options);
  const oriented = orient(matrix, options);
  const defect = unitarityDefect(oriented);
  if (options.nearest === true) {
    requireFinite(oriented);
    const unitary = nearestUnitary(oriented);
    const nearestDistance = frobeniusNorm(subtract(oriented, unitary));
    if (!(defect < Infinity && nearestDistance < Infinity)) throw tooFar();
    return { matrix: placeOnPorts(unitary, options), unitarityDefect: defect, nearestDistance };
  }
  requireUnitary(defect, options.unitaryWithin ?? DEFAULT_UNITARY_WITHIN);
  return { matrix: placeOnPorts(oriented, options), unitarityDefect: defect, nearestDistance: null };
}

function orient(matrix: ComplexMatrix, options: PrepareOptions): ComplexMatrix {
  const turned = options.transpose === true ? transpose(matrix) : matrix;
  return options.conjugate === true ? conjugate(turned) : turned;
}

function requireUnitary(defect: number, within: number): void {
  if (!(within >= 0 && within < Infinity)) {
    throw new InputError(
      'target/unitary-within',
      `the limit on the unitarity defect is ${within}`,
      'Give a number of at least 0, such as 1e-6.',
    );
  }
  if (defect <= within) return;
  throw new InputError(
    'target/not-unitary',
    `the target is not unitary: max |U^dagger U - I| is ${shortNumber(defect)}, over the limit of ${shortNumber(within)}`,
    'Correct the target, take the nearest unitary with --nearest, or raise --unitary-within.',
  );
}

function nearestUnitary(matrix: ComplexMatrix): ComplexMatrix {
  const { unitary, singularValues } = polarDecomposition(matrix);
  const largest = singularValues[0]!;
  const smallest = singularValues.at(-1)!;
  if (smallest > matrix.rows * Number.EPSILON * largest) return unitary;
  throw new InputError(
    'target/singular',
    `the target has no nearest unitary: its smallest singular value is ${shortNumber(smallest)}, its largest ${shortNumber(largest)}`,
    'Give a matrix whose rows are linearly independent.',
  );
}

function requireFinite({ columns, re, im }: ComplexMatrix): void {
  for (let k = 0; k < re.length; k++) {
    if (Number.isFinite(re[k]!) && Number.isFinite(im[k]!)) continue;
    throw notFinite(`(${re[k]}, ${im[k]})`, Math.floor(k / columns) + 1, (k % columns) + 1);
  }
}

/**
 * Entries near the square root of the largest double: their squares overflow, and no distance can be
 * reported.
 */
function tooFar(): InputError {
  return new InputError(
    'target/not-unitary',
    'the target is so far from unitary that its distance is beyond the largest number',
    'Divide the target by its norm first.',
  );
}

function requirePorts(size: number, { ports, modes }: PrepareOptions): void {
  if (modes !== undefined && !(Number.isInteger(modes) && modes >= 1)) {
    throw new RangeError(`modes is ${modes}, not a number of ports`);
  }
  if (ports === undefined) {
    if (modes === undefined || modes === size) return;
    throw new InputError(
      'target/size',
      `the target has ${size} ${size === 1 ? 'port' : 'ports'}, the chip ${modes}`,
      size < modes
        ? `Say which ports it acts on, for example --ports 1-${size}.`
        : `Use a chip of ${size} ports or more.`,
    );
  }
  if (modes === undefined) throw new RangeError('ports are given without the number of ports of the chip');
  const [first, last] = ports;
  if (!(Number.isInteger(first) && Number.isInteger(last) && first >= 1 && first <= last && last <= modes)) {
    throw new InputError(
      'target/ports',
      `ports ${first}-${last} do not lie on a chip of ${modes} ports`,
      `Give the first and the last port, within 1-${modes}.`,
    );
  }
  const length = last - first + 1;
  if (length !== size) {
    throw new InputError(
      'target/ports',
      `ports ${first}-${last} are ${length} ${length === 1 ? 'port' : 'ports'}, the target has ${size}`,
      first + size - 1 <= modes
        ? `Give as many ports as the target has, for example ${first}-${first + size - 1}.`
        : `Give ${size} ports within 1-${modes}.`,
    );
  }
}

function placeOnPorts(matrix: ComplexMatrix, { ports, modes }: PrepareOptions): ComplexMatrix {
  if (ports === undefined || modes === undefined) return matrix;
  const placed = identityMatrix(modes);
  const from = ports[0] - 1;
  const size = matrix.rows;
  for (let i = 0; i < size; i++) {
    const to = (from + i) * modes + from;
    placed.re.set(matrix.re.subarray(i * size, (i + 1) * size), to);
    placed.im.set(matrix.im.subarray(i * size, (i + 1) * size), to);
  }
  return placed;
}

function shortNumber(value: number): string {
  return String(Number(value.toPrecision(4)));
}
