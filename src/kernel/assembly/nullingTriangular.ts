// Reck's nulling; the readable twin is src/decompose/nullTriangular.ts.
import { columnOffset, findRotation, putAtCell, readDiagonal, ROTATION } from './nullingMatrix';
import { rotateColumnsRight } from './nullingMatrix';

/**
 * Cells before a column: in the columns k below N - 1 there are (k >> 1) + 1, in the others (2N-4-k >> 1) +
 * 1, as from the end.
 */
@inline function firstCellOf(modes: i32, column: i32): i32 {
  if (column < modes) return ((column + 1) >> 1) * ((column >> 1) + 1);
  const fromEnd = 2 * modes - 3 - column;
  return ((modes * (modes - 1)) >> 1) - ((fromEnd + 1) >> 1) * ((fromEnd >> 1) + 1);
}

/**
 * Nulls an N x N unitary for the triangular mesh that is not mirrored: row N from left to right by rotations
 * of neighbouring columns, then row N - 1, and so on. Parameters as for nullRectangular.
 */
export function nullTriangular(
  modes: i32, matrix: usize, rowBytes: usize, negligibleSquare: f64, reach: usize,
  chain: usize, results: usize, diagonalEntries: usize,
): void {
  const cells = (modes * (modes - 1)) >> 1;
  for (let row = modes - 1; row > 0; row--) {
    let lowest = matrix + usize(row) * rowBytes;
    let rotation = chain;
    for (let port = 0; port < row; port++) {
      const cell = firstCellOf(modes, port + 2 * (modes - 1 - row)) + (port >> 1);
      const nulled = lowest + columnOffset(port);
      const kept = lowest + columnOffset(port + 1);
      findRotation(rotation, nulled, kept, negligibleSquare, reach, cell);
      rotateColumnsRight(lowest, rowBytes, port, rotation, 1);
      putAtCell(results, cells, cell, rotation);
      rotation += ROTATION;
    }
    for (let above = row - 4; above >= 0; above -= 4) {
      lowest -= 4 * rowBytes;
      rotateColumnsRight(lowest, rowBytes, 0, chain, row);
    }
  }
  readDiagonal(modes, matrix, rowBytes, diagonalEntries);
}
