import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';
import type { Decomposition } from './Decomposition.js';
import { decomposeWith } from './decomposeWith.js';
import { nullOnKernels } from './nullOnKernels.js';

/**
 * Writes a unitary as a product of one 2x2 factor per cell of the mesh, in the order of the cells, and one
 * diagonal: Reck's nulling for a triangular mesh, Clements' for a rectangular one, mirrored as the mesh is.
 * Cost (20/3) N^3 flops, on WebAssembly kernels.
 * @param target N x N, unitary within the precision wanted of the result (not checked here)
 * @throws RangeError when the target's shape is not that of the mesh
 */
export function decompose(target: ComplexMatrix, mesh: Mesh): Decomposition {
  return decomposeWith(nullOnKernels, target, mesh);
}
