import type { MeshReach } from '../chip/MeshReach.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';
import { coincidentMirror } from '../mesh/Mesh.js';
import type { Decomposition } from './Decomposition.js';
import { decomposeWith } from './decomposeWith.js';
import { nullOnKernels } from './nullOnKernels.js';
import { nullReadably } from './nullReadably.js';

/**
 * Writes a unitary as a product of one 2x2 factor per cell of the mesh, in the order of the cells, and one
 * diagonal: Reck's nulling for a triangular mesh, Clements' for a rectangular one, mirrored as the mesh is.
 * Cost (20/3) N^3 flops, on WebAssembly kernels.
 *
 * With a reach the result is the same, to the last bit, where every factor is in reach. Elsewhere each step
 * of the nulling takes the nearest factor that its cell can do, and all later steps and the diagonal reckon
 * with it. The product then misses the target: a factor that is moved by an angle e leaves h sin e where
 * nothing should be, h^2 <= 1 the power in the two entries on which it acts, and to leading order 1 - F =
 * (2/N) sum (h e)^2. To move the factors of a finished decomposition costs (2/N) sum e^2. The idea of
 * hardware-aware nulling is that of Hamerly, Bandyopadhyay, Englund, Phys. Rev. Applied 18, 024018 and 024019
 * (2022), from memory.
 * @param target N x N, unitary within the precision wanted of the result (not checked here)
 * @param reach what the cells of the mesh can do, in cell order; without it, everything
 * @throws RangeError when the target's shape is not that of the mesh, or the reach is for another number of
 * cells
 */
export function decompose(target: ComplexMatrix, mesh: Mesh, reach: MeshReach | null = null): Decomposition {
  // The kernels judge a factor by itself.
  return decomposeWith(reach?.beside ? nullReadably : nullOnKernels, target, mesh, reach);
}

/**
 * The same as {@link decompose}, but nulled from the other side: the lower left triangle of the target turned
 * upside down or transposed, for the mirrored mesh that has its cells at the same places. Without a reach all
 * bar powers are equal, since a mesh does a target in one way only up to phases. With one the cells are met
 * in another order, so that other entries take what they cannot do; neither order is the better one on the
 * average.
 * @throws RangeError as `decompose` does
 */
export function decomposeFromFarSide(
  target: ComplexMatrix,
  mesh: Mesh,
  reach: MeshReach | null = null,
): Decomposition {
  return { ...decompose(target, farSideOf(mesh), reach), mesh };
}

/** One and the same mesh for each, so that what is known of its places serves many targets. */
function farSideOf(mesh: Mesh): Mesh {
  let far = farSides.get(mesh);
  if (far === undefined) farSides.set(mesh, (far = { ...mesh, mirror: coincidentMirror(mesh) }));
  return far;
}

const farSides = new WeakMap<Mesh, Mesh>();
