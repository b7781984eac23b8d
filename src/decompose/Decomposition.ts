import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { identityMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';

/**
 * A unitary as one 2x2 factor per cell of a mesh and one diagonal of phases. Factor k acts on the two ports
 * of cell k:
 *
 *     W_k = [ c  -conj(s) ]     c = cosine[k] >= 0,  s = sineRe[k] + i sineIm[k],  c^2 + |s|^2 = 1
 *           [ s   c       ]
 *
 * |W11|^2 = c^2 is the bar power that is wanted of the cell. c = 1 with s = 0 (bar) and c = 0 with s = 1
 * (cross) are exact. The factors know nothing of cell styles and splitter ratios.
 */
export interface Decomposition {
  readonly mesh: Mesh;
  readonly cosine: Float64Array;
  readonly sineRe: Float64Array;
  readonly sineIm: Float64Array;
  /** Phase in radians of the diagonal on each port. */
  readonly diagonal: Float64Array;
  /**
   * Per port, index of the first cell on it that the light meets behind the diagonal; the number of cells if
   * none.
   */
  readonly diagonalBefore: Int32Array;
}

/**
 * Multiplies the factors and the diagonal in the order in which the light meets them.
 * Cost O(N^3).
 */
export function reconstruct(decomposition: Decomposition): ComplexMatrix {
  const { mesh, cosine, sineRe, sineIm, diagonal, diagonalBefore } = decomposition;
  const { modes, cells, upperPortIndex } = mesh;
  const result = identityMatrix(modes);
  const { re, im } = result;
  const turnRowInPlace = (port: number): void => {
    const c = Math.cos(diagonal[port]!);
    const s = Math.sin(diagonal[port]!);
    for (let k = port * modes; k < (port + 1) * modes; k++) {
      const x = re[k]!;
      re[k] = c * x - s * im[k]!;
      im[k] = s * x + c * im[k]!;
    }
  };
  for (let cell = 0; cell < cells; cell++) {
    const upper = upperPortIndex[cell]!;
    for (const port of [upper, upper + 1]) if (diagonalBefore[port] === cell) turnRowInPlace(port);
    const c = cosine[cell]!;
    const sr = sineRe[cell]!;
    const si = sineIm[cell]!;
    for (let k = upper * modes; k < (upper + 1) * modes; k++) {
      const xr = re[k]!;
      const xi = im[k]!;
      const yr = re[k + modes]!;
      const yi = im[k + modes]!;
      re[k] = c * xr - (sr * yr + si * yi);
      im[k] = c * xi - (sr * yi - si * yr);
      re[k + modes] = sr * xr - si * xi + c * yr;
      im[k + modes] = sr * xi + si * xr + c * yi;
    }
  }
  for (let port = 0; port < modes; port++) if (diagonalBefore[port] === cells) turnRowInPlace(port);
  return result;
}
