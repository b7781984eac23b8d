import type { MeshReach } from '../chip/MeshReach.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';
import type { Decomposition } from './Decomposition.js';
import { decomposeWith } from './decomposeWith.js';
import { nullOnKernels } from './nullOnKernels.js';

/**
 * Writes a unitary as a product of one 2x2 factor per cell of the mesh, in the order of the cells, and one
 * diagonal: Reck's nulling for a triangular mesh, Clements' for a rectangular one, mirrored as the mesh is.
 * Cost (20/3) N^3 flops, on WebAssembly kernels.
 *
 * With a reach the product is the target where every factor is in reach, to the last bit as without one.
 * Elsewhere each step of the nulling takes the nearest factor that its cell can do, all later steps and the
 * diagonal reckon with it, and the product misses the target: to leading order by 1 - F = (2/N) sum over
 * those cells of (e r)^2, e the angle by which the factor was moved and r^2 <= 1 the power in the two entries
 * that it acts on, where moving the factors of a decomposition that is finished costs (2/N) sum e^2. Not by
 * more than the nearest product of factors in reach, to that order: a step leaves its remainder in an entry
 * that no later step touches with others than remainders, so the remainders are orthogonal to each other and
 * to all that the other factors can change. The idea of hardware-aware nulling is that of Hamerly,
 * Bandyopadhyay, Englund, Phys. Rev. Applied 18, 024018 and 024019 (2022), from memory.
 * @param target N x N, unitary within the precision wanted of the result (not checked here)
 * @param reach what the cells of the mesh can do, in cell order; without it, everything
 * @throws RangeError when the target's shape is not that of the mesh, or the reach is for another number of
 * cells
 */
export function decompose(target: ComplexMatrix, mesh: Mesh, reach: MeshReach | null = null): Decomposition {
  return decomposeWith(nullOnKernels, target, mesh, reach);
}
