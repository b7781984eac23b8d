// Clements' nulling; the readable twin is src/decompose/nullRectangular.ts.
import { COLUMN, columnOffset, findRotation, putAtCell, readDiagonal, ROTATION } from './nullingMatrix';
import { rotateColumnsLeft, rotateRowsDown } from './nullingMatrix';

/**
 * Cell with the upper port `port` in a column: there are N - 1 cells in two columns, N >> 1 of them in the
 * first.
 */
@inline function cellAt(modes: i32, column: i32, port: i32): i32 {
  return (column >> 1) * (modes - 1) + (column & 1) * (modes >> 1) + (port >> 1);
}

/** Cell of step k by columns, and by rows. */
@inline function cellByColumns(modes: i32, diagonal: i32, step: i32): i32 {
  return cellAt(modes, step, diagonal - step);
}
@inline function cellByRows(modes: i32, diagonal: i32, step: i32): i32 {
  return cellAt(modes, modes - 1 - step, modes - 2 - diagonal + step);
}

/** Step k rotates columns (d-k, d-k+1) so that entry (N-1-k, d-k) vanishes. */
function nullByColumns(
  modes: i32, matrix: usize, rowBytes: usize, diagonal: i32, sweep: usize, negligibleSquare: f64,
  reach: usize,
): void {
  let row = matrix + usize(modes - 1) * rowBytes;
  for (let group = 0; group < modes; group += 4) {
    const known = min(group, diagonal + 1);
    const all = min(group + 4, diagonal + 1);
    if (known > 0) rotateColumnsLeft(row, rowBytes, diagonal + 1, sweep, known);
    for (let step = known; step < all; step++) {
      const rotation = sweep + usize(step) * ROTATION;
      const ownRow = row - usize(step - group) * rowBytes;
      const left = diagonal - step;
      const nulled = ownRow + columnOffset(left);
      const kept = ownRow + columnOffset(left + 1);
      findRotation(rotation, nulled, kept, negligibleSquare, reach, cellByColumns(modes, diagonal, step));
      rotateColumnsLeft(row, rowBytes, left + 1, rotation, 1);
    }
    row -= 4 * rowBytes;
  }
}

/** Step k rotates rows (N-2-d+k, N-1-d+k) so that entry (N-1-d+k, k) vanishes. */
function nullByRows(
  modes: i32, matrix: usize, rowBytes: usize, diagonal: i32, sweep: usize, negligibleSquare: f64,
  reach: usize,
): void {
  const firstRow = matrix + usize(modes - 2 - diagonal) * rowBytes;
  for (let strip = 0; strip < modes; strip += 4) {
    const top = firstRow + usize(strip) * COLUMN;
    const known = min(strip, diagonal + 1);
    const all = min(strip + 4, diagonal + 1);
    if (known > 0) rotateRowsDown(top, rowBytes, sweep, known);
    for (let step = known; step < all; step++) {
      const rotation = sweep + usize(step) * ROTATION;
      const upper = top + usize(step) * rowBytes;
      const kept = upper + columnOffset(step - strip);
      const cell = cellByRows(modes, diagonal, step);
      findRotation(rotation, kept + rowBytes, kept, negligibleSquare, reach, cell);
      rotateRowsDown(upper, rowBytes, rotation, 1);
    }
  }
}

/**
 * Nulls an N x N unitary for the rectangular mesh that is not mirrored.
 * @param matrix address of row 0, laid out as nullingMatrix.ts says; lost
 * @param reach least c and least |s| of the cells in mesh order, two doubles a cell
 * @param sweep room for N - 1 rotations
 * @param results c, re s and im s of the cells in mesh order, N(N-1)/2 doubles each
 * @param diagonalEntries re and im of the N entries that are left on the diagonal
 */
export function nullRectangular(
  modes: i32, matrix: usize, rowBytes: usize, negligibleSquare: f64, reach: usize,
  sweep: usize, results: usize, diagonalEntries: usize,
): void {
  const cells = (modes * (modes - 1)) >> 1;
  for (let diagonal = 0; diagonal < modes - 1; diagonal++) {
    const byRows = (diagonal & 1) === 1;
    if (byRows) nullByRows(modes, matrix, rowBytes, diagonal, sweep, negligibleSquare, reach);
    else nullByColumns(modes, matrix, rowBytes, diagonal, sweep, negligibleSquare, reach);
    for (let step = 0; step <= diagonal; step++) {
      const cell = byRows ? cellByRows(modes, diagonal, step) : cellByColumns(modes, diagonal, step);
      putAtCell(results, cells, cell, sweep + usize(step) * ROTATION);
    }
  }
  readDiagonal(modes, matrix, rowBytes, diagonalEntries);
}
