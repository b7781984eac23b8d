import type { Mesh } from './Mesh.js';

/**
 * For each column the first cell that light from some neighbouring ports can have reached and the one behind
 * the last, two numbers a column: starting from a few ports, light spreads by one port a column.
 * @param top,bottom first and last of the ports (indices from 0)
 */
export function reachedCells(mesh: Mesh, top: number, bottom: number): number[] {
  const { columns, upperPortIndex, firstCellOfColumn } = mesh;
  const ranges: number[] = [];
  for (let column = 0; column < columns; column++) {
    const end = firstCellOfColumn[column + 1]!;
    let first = firstCellOfColumn[column]!;
    while (first < end && upperPortIndex[first]! + 1 < top) first++;
    let last = first;
    while (last < end && upperPortIndex[last]! <= bottom) last++;
    ranges.push(first, last);
    if (last > first) {
      top = Math.min(top, upperPortIndex[first]!);
      bottom = Math.max(bottom, upperPortIndex[last - 1]! + 1);
    }
  }
  return ranges;
}
