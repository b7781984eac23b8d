import type { Mesh } from './Mesh.js';

/**
 * How many cells light can meet on its way through a mesh, over all ways from any input to any output: the
 * fewest and the most. A rectangle of N ports has N at most, a triangle 2N - 3; there some light meets a
 * single cell.
 */
export function cellsPassed({ modes, cells, upperPortIndex }: Mesh): {
  readonly fewest: number;
  readonly most: number;
} {
  const fewest = new Int32Array(modes);
  const most = new Int32Array(modes);
  // Light comes to either output of a cell from both of its inputs.
  for (let cell = 0; cell < cells; cell++) {
    const upper = upperPortIndex[cell]!;
    const lower = upper + 1;
    fewest[upper] = fewest[lower] = Math.min(fewest[upper]!, fewest[lower]!) + 1;
    most[upper] = most[lower] = Math.max(most[upper]!, most[lower]!) + 1;
  }
  return { fewest: Math.min(...fewest), most: Math.max(...most) };
}
