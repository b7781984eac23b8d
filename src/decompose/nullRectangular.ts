import type { MeshReach } from '../chip/MeshReach.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';
import { cellIndexAt } from '../mesh/Mesh.js';
import type { Rotations } from './Rotations.js';
import { createRotations, setNullingRotation } from './Rotations.js';

/**
 * Clements' nulling for the rectangular mesh that is not mirrored: the lower left triangle is nulled diagonal
 * by diagonal from the corner, odd diagonals by rotations of neighbouring columns (cells before the
 * diagonal), even ones by rotations of neighbouring rows (cells behind it). Clements et al., Optica 3, 1460
 * (2016).
 *
 * Afterwards `work` is diagonal up to rounding and what cells out of reach leave, and U = (row rotations) D
 * (column rotations), in the order of the light from the right; the rotations W stand at their cells. Cost
 * (20/3) N^3 flops. The readable twin of the kernel in src/kernel/assembly/nullingRectangular.ts: the same
 * arithmetic in the same order, so the same result to the last bit.
 * @param negligibleSquare entries whose squares are at most that count as zero
 * @param reach what the cells can do
 */
export function nullRectangularInPlace(
  work: ComplexMatrix,
  mesh: Mesh,
  negligibleSquare: number,
  reach: MeshReach,
): Rotations {
  const modes = work.rows;
  const sweep = createRotations(Math.max(0, modes - 1));
  const rotations = createRotations(mesh.cells);
  for (let diagonal = 0; diagonal < modes - 1; diagonal++) {
    const byRows = diagonal % 2 === 1;
    const cellOf = (step: number): number =>
      byRows
        ? cellIndexAt(mesh, modes - 1 - step, modes - 2 - diagonal + step)
        : cellIndexAt(mesh, step, diagonal - step);
    const nullInPlace = byRows ? nullByRowsInPlace : nullByColumnsInPlace;
    nullInPlace(work, diagonal, sweep, negligibleSquare, reach, cellOf);
    for (let step = 0; step <= diagonal; step++) {
      const cell = cellOf(step);
      rotations.cosine[cell] = sweep.cosine[step]!;
      rotations.sineRe[cell] = sweep.sineRe[step]!;
      rotations.sineIm[cell] = sweep.sineIm[step]!;
    }
  }
  return rotations;
}

/**
 * Step k rotates columns (d-k, d-k+1) so that entry (N-1-k, d-k) vanishes. Rows are taken from the bottom,
 * each one passing through all the steps that are known when it comes: the memory is then read in its own
 * order.
 */
function nullByColumnsInPlace(
  { rows: modes, re, im }: ComplexMatrix,
  diagonal: number,
  sweep: Rotations,
  negligibleSquare: number,
  reach: MeshReach,
  cellOf: (step: number) => number,
): void {
  const { cosine, sineRe, sineIm } = sweep;
  for (let row = modes - 1; row >= 0; row--) {
    const ownStep = modes - 1 - row;
    const findsOne = ownStep <= diagonal;
    const known = findsOne ? ownStep : diagonal + 1;
    let at = row * modes + diagonal;
    let carryRe = re[at + 1]!;
    let carryIm = im[at + 1]!;
    for (let step = 0; step < known; step++) {
      const c = cosine[step]!;
      const sr = sineRe[step]!;
      const si = sineIm[step]!;
      const xr = re[at]!;
      const xi = im[at]!;
      re[at + 1] = sr * xr + si * xi + c * carryRe;
      im[at + 1] = sr * xi - si * xr + c * carryIm;
      const nextRe = c * xr - (sr * carryRe - si * carryIm);
      carryIm = c * xi - (sr * carryIm + si * carryRe);
      carryRe = nextRe;
      at--;
    }
    if (!findsOne) {
      re[at + 1] = carryRe;
      im[at + 1] = carryIm;
      continue;
    }
    const xr = re[at]!;
    const xi = im[at]!;
    const cell = cellOf(ownStep);
    setNullingRotation(sweep, ownStep, xr, xi, carryRe, carryIm, negligibleSquare, reach, cell);
    const c = cosine[ownStep]!;
    const sr = sineRe[ownStep]!;
    const si = sineIm[ownStep]!;
    re[at + 1] = sr * xr + si * xi + c * carryRe;
    im[at + 1] = sr * xi - si * xr + c * carryIm;
    re[at] = 0;
    im[at] = 0;
  }
}

/**
 * Step k rotates rows (N-2-d+k, N-1-d+k) so that entry (N-1-d+k, k) vanishes; columns left of k are zero
 * already.
 */
function nullByRowsInPlace(
  { rows: modes, re, im }: ComplexMatrix,
  diagonal: number,
  sweep: Rotations,
  negligibleSquare: number,
  reach: MeshReach,
  cellOf: (step: number) => number,
): void {
  for (let step = 0; step <= diagonal; step++) {
    const upper = (modes - 2 - diagonal + step) * modes;
    const lower = upper + modes;
    const at = lower + step;
    const kept = upper + step;
    const cell = cellOf(step);
    setNullingRotation(sweep, step, re[at]!, im[at]!, re[kept]!, im[kept]!, negligibleSquare, reach, cell);
    const c = sweep.cosine[step]!;
    const sr = sweep.sineRe[step]!;
    const si = sweep.sineIm[step]!;
    for (let column = step; column < modes; column++) {
      const xr = re[upper + column]!;
      const xi = im[upper + column]!;
      const yr = re[lower + column]!;
      const yi = im[lower + column]!;
      re[upper + column] = c * xr + (sr * yr + si * yi);
      im[upper + column] = c * xi + (sr * yi - si * yr);
      re[lower + column] = c * yr - (sr * xr - si * xi);
      im[lower + column] = c * yi - (sr * xi + si * xr);
    }
    re[at] = 0;
    im[at] = 0;
  }
}
