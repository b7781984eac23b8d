import type { MeshReach } from '../chip/MeshReach.js';
import { fullReach } from '../chip/MeshReach.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { copyMatrix } from '../matrix/ComplexMatrix.js';
import { reversePorts, transpose } from '../matrix/products.js';
import type { Layout } from '../mesh/Mesh.js';
import { createMesh } from '../mesh/Mesh.js';
import type { Mirrored, NullingResult } from './Nulling.js';
import { nullRectangularInPlace } from './nullRectangular.js';
import { nullTriangularInPlace } from './nullTriangular.js';

/** The nulling in plain TypeScript: the twin of `nullOnKernels`. */
export function nullReadably(
  target: ComplexMatrix,
  layout: Layout,
  mirrored: Mirrored,
  negligibleSquare: number,
  reach: MeshReach | null,
): NullingResult {
  let work = mirrored.ports ? reversePorts(target) : copyMatrix(target);
  if (mirrored.columns) work = transpose(work);
  const modes = work.rows;
  const mesh = createMesh(layout, modes);
  const nullInPlace = layout === 'rectangular' ? nullRectangularInPlace : nullTriangularInPlace;
  const rotations = nullInPlace(work, mesh, negligibleSquare, reach ?? fullReach(mesh.cells));
  const diagonal = Float64Array.from({ length: modes }, (_, i) =>
    Math.atan2(work.im[i * modes + i]!, work.re[i * modes + i]!),
  );
  return { rotations, diagonal };
}
