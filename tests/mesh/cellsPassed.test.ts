import { describe, expect, it } from 'vitest';
import { cellsPassed } from '../../src/mesh/cellsPassed.js';
import type { Mesh } from '../../src/mesh/Mesh.js';
import { createMesh, LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';

/** The numbers of cells on all ways through a mesh, each walked by itself. */
function allWays({ modes, columns, firstCellOfColumn, upperPortIndex }: Mesh): number[] {
  const walk = (port: number, column: number, passed: number): number[] => {
    if (column === columns) return [passed];
    for (let cell = firstCellOfColumn[column]!; cell < firstCellOfColumn[column + 1]!; cell++) {
      const upper = upperPortIndex[cell]!;
      if (port === upper || port === upper + 1) {
        return [upper, upper + 1].flatMap((next) => walk(next, column + 1, passed + 1));
      }
    }
    return walk(port, column + 1, passed);
  };
  return Array.from({ length: modes }, (_, port) => walk(port, 0, 0)).flat();
}

describe('the cells that light passes', () => {
  it.each([1, 2, 3, 4, 5, 6])('are those of the shortest and of the longest way: N = %i', (modes) => {
    for (const layout of LAYOUTS) {
      for (const mirror of MIRRORS) {
        const mesh = createMesh(layout, modes, mirror);
        const ways = allWays(mesh);
        expect(cellsPassed(mesh)).toEqual({ fewest: Math.min(...ways), most: Math.max(...ways) });
      }
    }
  });

  // Clements et al., Optica 3, 1460 (2016): depth N against 2N - 3.
  it('are N at most in a rectangle and 2N - 3 in a triangle, where one way meets a single cell', () => {
    expect(cellsPassed(createMesh('rectangular', 20)).most).toBe(20);
    expect(cellsPassed(createMesh('triangular', 20))).toEqual({ fewest: 1, most: 37 });
  });
});
