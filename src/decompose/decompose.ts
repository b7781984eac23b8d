import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { copyMatrix } from '../matrix/ComplexMatrix.js';
import { reversePorts, transpose } from '../matrix/products.js';
import type { Mesh } from '../mesh/Mesh.js';
import { createMesh } from '../mesh/Mesh.js';
import type { Decomposition } from './Decomposition.js';
import { nullRectangularInPlace } from './nullRectangular.js';
import { nullTriangularInPlace } from './nullTriangular.js';
import type { Rotations } from './Rotations.js';
import { createRotations } from './Rotations.js';

/** Entries up to NEGLIGIBLE * N * eps count as zero: rounding in the nulling itself was seen to stay below 2 N eps. */
const NEGLIGIBLE = 4;

/**
 * Writes a unitary as a product of one 2x2 factor per cell of the mesh, in the order of the cells, and one diagonal:
 * Reck's nulling for a triangular mesh, Clements' for a rectangular one, mirrored as the mesh is.
 * @param target N x N, unitary within the precision wanted of the result (not checked here)
 * @throws RangeError when the target's shape is not that of the mesh
 */
export function decompose(target: ComplexMatrix, mesh: Mesh): Decomposition {
  const { modes, layout, mirror } = mesh;
  if (target.rows !== modes || target.columns !== modes) {
    throw new RangeError(`the mesh has ${modes} ports, the target is ${target.rows} x ${target.columns}`);
  }
  const portsMirrored = mirror === 'ports' || mirror === 'both';
  const columnsMirrored = mirror === 'columns' || mirror === 'both';
  const plainMesh = mirror === 'none' ? mesh : createMesh(layout, modes);
  let work = portsMirrored ? reversePorts(target) : copyMatrix(target);
  // A mesh with its columns reversed does the transpose of what the plain one does with transposed cells.
  if (columnsMirrored) work = transpose(work);
  const negligible = NEGLIGIBLE * modes * Number.EPSILON;
  const { rotations, behindDiagonal } =
    layout === 'rectangular'
      ? nullRectangularInPlace(work, plainMesh, negligible)
      : {
          rotations: nullTriangularInPlace(work, plainMesh, negligible),
          behindDiagonal: new Uint8Array(mesh.cells),
        };
  const plain = { rotations, behindDiagonal, diagonal: diagonalPhases(work) };
  return placeOnMesh(plain, plainMesh, mesh, portsMirrored, columnsMirrored);
}

interface PlainNulling {
  readonly rotations: Rotations;
  readonly behindDiagonal: Uint8Array;
  readonly diagonal: Float64Array;
}

/** Carries the factors of the plain mesh to the cells of the mirrored one. */
function placeOnMesh(
  plain: PlainNulling,
  plainMesh: Mesh,
  mesh: Mesh,
  portsMirrored: boolean,
  columnsMirrored: boolean,
): Decomposition {
  const { modes, cells, columns } = mesh;
  const placed = createRotations(cells);
  const behind = new Uint8Array(cells);
  // X W X and W^T both turn s into -conj(s); together they leave it as it was.
  const conjugated = portsMirrored !== columnsMirrored;
  for (let cell = 0; cell < cells; cell++) {
    const plainColumn = plainMesh.columnIndex[cell]!;
    const column = columnsMirrored ? columns - 1 - plainColumn : plainColumn;
    const inColumn = cell - plainMesh.firstCellOfColumn[plainColumn]!;
    const place = portsMirrored
      ? mesh.firstCellOfColumn[column + 1]! - 1 - inColumn
      : mesh.firstCellOfColumn[column]! + inColumn;
    placed.cosine[place] = plain.rotations.cosine[cell]!;
    placed.sineRe[place] = conjugated ? -plain.rotations.sineRe[cell]! : plain.rotations.sineRe[cell]!;
    placed.sineIm[place] = plain.rotations.sineIm[cell]!;
    behind[place] = columnsMirrored ? 1 - plain.behindDiagonal[cell]! : plain.behindDiagonal[cell]!;
  }
  const diagonalBefore = new Int32Array(modes).fill(cells);
  for (let cell = cells - 1; cell >= 0; cell--) {
    if (behind[cell] === 0) continue;
    const upper = mesh.upperPortIndex[cell]!;
    diagonalBefore[upper] = cell;
    diagonalBefore[upper + 1] = cell;
  }
  const diagonal = portsMirrored ? plain.diagonal.slice().reverse() : plain.diagonal;
  return { mesh, ...placed, diagonal, diagonalBefore };
}

function diagonalPhases({ rows: modes, re, im }: ComplexMatrix): Float64Array {
  return Float64Array.from({ length: modes }, (_, i) => Math.atan2(im[i * modes + i]!, re[i * modes + i]!));
}
