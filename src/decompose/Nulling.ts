import type { MeshReach } from '../chip/MeshReach.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Layout } from '../mesh/Mesh.js';
import type { Rotations } from './Rotations.js';

/** The mirrors of a mesh one by one. */
export interface Mirrored {
  /** The mesh is the plain one turned upside down: it does J U J where that one does U. */
  readonly ports: boolean;
  /**
   * The mesh is the plain one with its columns in reverse order: with transposed cells it does U^T where that
   * one does U.
   */
  readonly columns: boolean;
}

/** What nulling finds for the mesh that is not mirrored. */
export interface NullingResult {
  /** At the cells of that mesh. */
  readonly rotations: Rotations;
  /** Phases in radians of the entries that are left on the diagonal. */
  readonly diagonal: Float64Array;
}

/**
 * Nulls the target, mirrored as the mesh is, for the mesh that is not mirrored. There are two with the same
 * result to the last bit: one on kernels, and its readable twin.
 * @param negligibleSquare entries whose squares are at most that count as zero
 * @param reach what the cells of the mesh that is not mirrored can do; null: everything
 */
export type Nulling = (
  target: ComplexMatrix,
  layout: Layout,
  mirrored: Mirrored,
  negligibleSquare: number,
  reach: MeshReach | null,
) => NullingResult;
