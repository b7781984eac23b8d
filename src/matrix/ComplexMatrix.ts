/**
 * A dense complex matrix: real and imaginary parts in two planes, row by row. Entry (row, column), both
 * counted from 0, stands at index `row * columns + column` of `re` and `im`. Treated as immutable, except
 * by functions whose name ends in `InPlace` and by whoever has just made it.
 */
export interface ComplexMatrix {
  readonly rows: number;
  readonly columns: number;
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** A matrix of zeros. */
export function zeroMatrix(rows: number, columns: number): ComplexMatrix {
  return { rows, columns, re: new Float64Array(rows * columns), im: new Float64Array(rows * columns) };
}

/** The identity on `modes` ports. */
export function identityMatrix(modes: number): ComplexMatrix {
  const identity = zeroMatrix(modes, modes);
  for (let i = 0; i < modes; i++) identity.re[i * modes + i] = 1;
  return identity;
}

/** An entry as a person writes it: a real number or a pair [re, im]. */
export type Entry = number | readonly [re: number, im: number];

/** A matrix from nested rows, all of one length. @throws RangeError when they are not. */
export function matrixFromRows(rows: readonly (readonly Entry[])[]): ComplexMatrix {
  const columns = rows[0]?.length ?? 0;
  const matrix = zeroMatrix(rows.length, columns);
  rows.forEach((row, i) => {
    if (row.length !== columns) {
      throw new RangeError(`row ${i + 1} has ${row.length} entries, row 1 has ${columns}`);
    }
    row.forEach((entry, j) => {
      matrix.re[i * columns + j] = typeof entry === 'number' ? entry : entry[0];
      matrix.im[i * columns + j] = typeof entry === 'number' ? 0 : entry[1];
    });
  });
  return matrix;
}

/** A copy that shares nothing with the original. */
export function copyMatrix(matrix: ComplexMatrix): ComplexMatrix {
  return { ...matrix, re: matrix.re.slice(), im: matrix.im.slice() };
}
