import { describe, expect, it } from 'vitest';
import type { Mesh } from '../../src/mesh/Mesh.js';
import { cellIndexAt, coincidentMirror, createMesh, LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';

/** Cells as [column, upper port], both from 1, in the order of their numbers. */
function places(mesh: Mesh): [number, number][] {
  return Array.from({ length: mesh.cells }, (_, k) => [
    mesh.columnIndex[k]! + 1,
    mesh.upperPortIndex[k]! + 1,
  ]);
}

describe('counts', () => {
  // Reck et al., Phys. Rev. Lett. 73, 58 (1994); Clements et al., Optica 3, 1460 (2016): N(N-1)/2 cells,
  // depth 2N-3 and N.
  it.each([2, 3, 4, 5, 8, 16, 33])('has N(N-1)/2 cells and the published depth, N = %i', (modes) => {
    for (const mirror of MIRRORS) {
      const rectangular = createMesh('rectangular', modes, mirror);
      const triangular = createMesh('triangular', modes, mirror);
      expect(rectangular.cells).toBe((modes * (modes - 1)) / 2);
      expect(triangular.cells).toBe((modes * (modes - 1)) / 2);
      expect(rectangular.columns).toBe(modes === 2 ? 1 : modes);
      expect(triangular.columns).toBe(2 * modes - 3);
    }
  });

  it('has neither cells nor columns for one port', () => {
    for (const layout of LAYOUTS) expect(createMesh(layout, 1)).toMatchObject({ cells: 0, columns: 0 });
  });
});

describe('places', () => {
  it('starts odd columns of a rectangle on port 1, even ones on port 2', () => {
    expect(places(createMesh('rectangular', 4))).toEqual([
      [1, 1],
      [1, 3],
      [2, 2],
      [3, 1],
      [3, 3],
      [4, 2],
    ]);
    expect(places(createMesh('rectangular', 3))).toEqual([
      [1, 1],
      [2, 2],
      [3, 1],
    ]);
  });

  it('puts the cells on ports (m, m+1) of a triangle in columns m, m+2, ..., 2N-2-m', () => {
    expect(places(createMesh('triangular', 4))).toEqual([
      [1, 1],
      [2, 2],
      [3, 1],
      [3, 3],
      [4, 2],
      [5, 1],
    ]);
    for (const modes of [2, 3, 5, 9]) {
      const expected: [number, number][] = [];
      for (let m = 1; m < modes; m++) for (let c = m; c <= 2 * modes - 2 - m; c += 2) expected.push([c, m]);
      expected.sort((a, b) => a[0] - b[0] || a[1] - b[1]);
      expect(places(createMesh('triangular', modes))).toEqual(expected);
    }
  });

  it('mirrors as conventions section 4 says', () => {
    const firstPort = (...mesh: Parameters<typeof createMesh>): number => places(createMesh(...mesh))[0]![1];
    expect(firstPort('rectangular', 6, 'columns')).toBe(2);
    expect(firstPort('rectangular', 5, 'columns')).toBe(1);
    expect(firstPort('rectangular', 5, 'ports')).toBe(2);
    expect(firstPort('rectangular', 6, 'ports')).toBe(1);
    expect(places(createMesh('triangular', 5, 'columns'))).toEqual(places(createMesh('triangular', 5)));
    // The apex, the one cell alone in the middle column's end, stands on the top ports.
    const apex = places(createMesh('triangular', 4, 'ports')).filter(([, port]) => port === 1);
    expect(apex).toEqual([[3, 1]]);
  });

  it.each(LAYOUTS)('numbers the cells of a mirrored %s mesh by the same rule', (layout) => {
    for (const mirror of MIRRORS) {
      for (let modes = 1; modes <= 9; modes++) {
        const mesh = createMesh(layout, modes, mirror);
        const cells = places(mesh);
        const sorted = cells.slice().sort((a, b) => a[0] - b[0] || a[1] - b[1]);
        expect(cells).toEqual(sorted);
        const plain = places(createMesh(layout, modes)).map(([column, port]) => [
          mirror === 'columns' || mirror === 'both' ? mesh.columns + 1 - column : column,
          mirror === 'ports' || mirror === 'both' ? modes - port : port,
        ]);
        expect(new Set(cells.map(String))).toEqual(new Set(plain.map(String)));
        cells.forEach(([column, port], k) => expect(cellIndexAt(mesh, column - 1, port - 1)).toBe(k));
      }
    }
  });
});

it('refuses a number of ports that is none', () => {
  for (const modes of [0, -1, 2.5, NaN, Infinity]) {
    expect(() => createMesh('rectangular', modes)).toThrow(RangeError);
  }
});

describe('the coincident mirror', () => {
  it('is another one, has the same places, and is mutual', () => {
    for (const layout of LAYOUTS) {
      for (let modes = 1; modes <= 9; modes++) {
        for (const mirror of MIRRORS) {
          const mesh = createMesh(layout, modes, mirror);
          const other = createMesh(layout, modes, coincidentMirror(mesh));
          expect(other.mirror).not.toBe(mirror);
          expect({ ...other, mirror }).toEqual(mesh);
          expect(coincidentMirror(other)).toBe(mirror);
        }
      }
    }
  });
});
