import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import type { Complex } from './Complex.js';
import { requireSquare } from './limits.js';
import type { OwnArgument } from './ownFunctions.js';

/**
 * What a formula's parts evaluate to: numbers and nested arrays of them, as the library of functions takes
 * them.
 */
export type FormulaValue = number | Complex | readonly FormulaValue[];

/** Size of a value by its first entries: [] for a number, [2, 3] for two rows of three. */
export function sizesOf(value: FormulaValue): number[] {
  const sizes: number[] = [];
  let inner: FormulaValue | undefined = value;
  while (isArray(inner)) {
    sizes.push(inner.length);
    inner = inner[0];
  }
  return sizes;
}

/**
 * A value as it came from the library, checked: numbers only, all finite, and arrays rectangular.
 * @throws InputError `target/not-finite`, `target/ragged` or `target/argument`; `label` says whose value it
 * is.
 */
export function checkedValue(value: unknown, label: string): FormulaValue {
  const bare = isArray(value) || !hasToArray(value) ? value : value.toArray();
  checkLevel(bare, sizesOf(bare as FormulaValue), 0, label);
  return bare as FormulaValue;
}

function checkLevel(value: unknown, sizes: readonly number[], level: number, label: string): void {
  if (isArray(value)) {
    if (value.length !== sizes[level]) throw ragged();
    for (const inner of value) checkLevel(inner, sizes, level + 1, label);
    return;
  }
  const number = typeof value === 'number' ? { re: value, im: 0 } : value;
  if (!isComplex(number)) {
    throw new InputError(
      'target/argument',
      `${label} gives something that is not a number`,
      'A formula works with numbers and matrices.',
    );
  }
  if (level !== sizes.length) throw ragged();
  if (Number.isFinite(number.re) && Number.isFinite(number.im)) return;
  throw new InputError(
    'target/not-finite',
    `${label} gives a number that is not finite`,
    'Look for a division by zero, or for an exponent that is too large.',
  );
}

function ragged(): InputError {
  return new InputError(
    'target/ragged',
    'the rows of a matrix in the formula differ in length',
    'Give every row the same number of entries; put matrices side by side with direct(A, B) or concat(A, B).',
  );
}

/**
 * The value as a square matrix. @throws InputError `target/not-square` for anything else, `target/too-large`.
 */
export function matrixOf(value: FormulaValue, maxModes: number): ComplexMatrix {
  const sizes = sizesOf(value);
  if (sizes.length !== 2) {
    const what =
      sizes.length === 0
        ? 'a number'
        : sizes.length === 1
          ? 'a list'
          : `an array of size ${sizes.join(' x ')}`;
    throw new InputError(
      'target/not-square',
      `the formula gives ${what}, not a square matrix`,
      sizes.length > 2
        ? 'Put matrices together with direct(A, B) or concat(A, B), not with brackets.'
        : 'A matrix is written [1, 0; 0, 1] or made by a function such as dft(4).',
    );
  }
  requireSquare(sizes[0]!, sizes[1]!, maxModes);
  return planarMatrix(value);
}

/** A value of two levels in planes. */
function planarMatrix(value: FormulaValue): ComplexMatrix {
  const rows = value as readonly (readonly (number | Complex)[])[];
  const columns = rows[0]!.length;
  const matrix = zeroMatrix(rows.length, columns);
  rows.forEach((row, i) => {
    row.forEach((entry, j) => {
      matrix.re[i * columns + j] = typeof entry === 'number' ? entry : entry.re;
      matrix.im[i * columns + j] = typeof entry === 'number' ? 0 : entry.im;
    });
  });
  return matrix;
}

/**
 * A matrix as nested arrays; `complex` makes the library's complex numbers, left out where the entry is real.
 */
export function nestedRows(
  { rows, columns, re, im }: ComplexMatrix,
  complex: (re: number, im: number) => Complex,
): FormulaValue {
  return Array.from({ length: rows }, (_, i) =>
    Array.from({ length: columns }, (_, j) => {
      const k = i * columns + j;
      return im[k] === 0 ? re[k]! : complex(re[k]!, im[k]!);
    }),
  );
}

/** The value as an argument for a function of ours; one row of a matrix counts as a list too. */
export function ownArgument(value: FormulaValue, wantsList: boolean): OwnArgument {
  if (typeof value === 'number') return { re: value, im: 0 };
  if (!isArray(value)) return { re: value.re, im: value.im };
  const sizes = sizesOf(value);
  if (wantsList && sizes.length === 2 && sizes[0] === 1) return ownArgument(value[0]!, false);
  if (sizes.length === 2) return planarMatrix(value);
  if (sizes.length === 1) return value.map((entry) => ownArgument(entry, false) as Complex);
  throw new InputError(
    'target/argument',
    `an array of size ${sizes.join(' x ')} is no argument here`,
    'Give a number, a list or a matrix.',
  );
}

function isArray(value: unknown): value is readonly FormulaValue[] {
  return Array.isArray(value);
}

function isComplex(value: unknown): value is Complex {
  return (
    typeof value === 'object' &&
    value !== null &&
    're' in value &&
    'im' in value &&
    typeof value.re === 'number' &&
    typeof value.im === 'number'
  );
}

function hasToArray(value: unknown): value is { toArray(): unknown } {
  return (
    typeof value === 'object' && value !== null && 'toArray' in value && typeof value.toArray === 'function'
  );
}
