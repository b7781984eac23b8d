import type { MeshReach } from '../chip/MeshReach.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';
import { cellIndexAt } from '../mesh/Mesh.js';
import type { Rotations } from './Rotations.js';
import { createRotations, setNullingRotation } from './Rotations.js';

/**
 * Reck's nulling for the triangular mesh that is not mirrored: row N is nulled from left to right by
 * rotations of neighbouring columns, then row N-1, and so on. Reck et al., Phys. Rev. Lett. 73, 58 (1994).
 *
 * Afterwards `work` is diagonal up to rounding and what cells out of reach leave (entries of nulled rows are
 * not written back except the diagonal one), and U = D W_M ... W_2 W_1 with the rotations W at their cells.
 * Cost (20/3) N^3 flops. The readable twin of the kernel in src/kernel/assembly/nullingTriangular.ts: the
 * same arithmetic in the same order, so the same result to the last bit.
 * @param negligibleSquare entries whose squares are at most that count as zero
 * @param reach what the cells can do
 */
export function nullTriangularInPlace(
  work: ComplexMatrix,
  mesh: Mesh,
  negligibleSquare: number,
  reach: MeshReach,
): Rotations {
  const { rows: modes, re, im } = work;
  const chain = createRotations(Math.max(0, modes - 1));
  const rotations = createRotations(mesh.cells);
  for (let row = modes - 1; row >= 1; row--) {
    const chainNumber = modes - 1 - row;
    const cellOf = (port: number): number => cellIndexAt(mesh, port + 2 * chainNumber, port);
    findChainInPlace(work, row, chain, negligibleSquare, reach, cellOf);
    for (let above = 0; above < row; above++) applyChainInPlace(re, im, above * modes, row, chain);
    for (let port = 0; port < row; port++) {
      const cell = cellOf(port);
      rotations.cosine[cell] = chain.cosine[port]!;
      rotations.sineRe[cell] = chain.sineRe[port]!;
      rotations.sineIm[cell] = chain.sineIm[port]!;
    }
  }
  return rotations;
}

/** Finds the rotations that sweep a row into its diagonal entry, which is written back. */
function findChainInPlace(
  { rows: modes, re, im }: ComplexMatrix,
  row: number,
  chain: Rotations,
  negligibleSquare: number,
  reach: MeshReach,
  cellOf: (port: number) => number,
): void {
  const start = row * modes;
  let carryRe = re[start]!;
  let carryIm = im[start]!;
  for (let port = 0; port < row; port++) {
    const nextRe = re[start + port + 1]!;
    const nextIm = im[start + port + 1]!;
    const cell = cellOf(port);
    setNullingRotation(chain, port, carryRe, carryIm, nextRe, nextIm, negligibleSquare, reach, cell);
    const c = chain.cosine[port]!;
    const sr = chain.sineRe[port]!;
    const si = chain.sineIm[port]!;
    const sweptRe = sr * carryRe + si * carryIm + c * nextRe;
    const sweptIm = sr * carryIm - si * carryRe + c * nextIm;
    carryRe = sweptRe;
    carryIm = sweptIm;
  }
  re[start + row] = carryRe;
  im[start + row] = carryIm;
}

/** Multiplies one row of the matrix by the adjoints of the chain's rotations, first to last. */
function applyChainInPlace(
  re: Float64Array,
  im: Float64Array,
  start: number,
  length: number,
  { cosine, sineRe, sineIm }: Rotations,
): void {
  let carryRe = re[start]!;
  let carryIm = im[start]!;
  for (let port = 0; port < length; port++) {
    const c = cosine[port]!;
    const sr = sineRe[port]!;
    const si = sineIm[port]!;
    const nextRe = re[start + port + 1]!;
    const nextIm = im[start + port + 1]!;
    re[start + port] = c * carryRe - (sr * nextRe - si * nextIm);
    im[start + port] = c * carryIm - (sr * nextIm + si * nextRe);
    const sweptRe = sr * carryRe + si * carryIm + c * nextRe;
    carryIm = sr * carryIm - si * carryRe + c * nextIm;
    carryRe = sweptRe;
  }
  re[start + length] = carryRe;
  im[start + length] = carryIm;
}
