import { ratiosOfCell } from './cellSplitters.js';
import { applyOuterSplitterInPlace } from './cellTransfer.js';
import type { Chip, PhaseRange } from './Chip.js';
import { externalAtOutput } from './Chip.js';
import type { BesideFactors, MeshReach } from './MeshReach.js';
import { cosineOfSum, sineOfDifference } from './reach.js';
import { shifterIndicesOfCell } from './shifters.js';

/**
 * What each cell of a chip can attain with the two splitters around its arms and within the range of its
 * internal phase: with q = sin^2(theta/2), cos^2(theta/2) for real splitters,
 *
 *     |W11|^2 = cos^2(a+b) + q sin 2a sin 2b,    |W12|^2 = sin^2(a-b) + (1 - q) sin 2a sin 2b
 *
 * (conventions, section 5). A theta that can take one value only leaves one point. Ranges of external phases
 * play no part: they do not move powers. Losses are ignored.
 */
export function reachOfChip(chip: Chip): MeshReach {
  const { mesh, style, couplingRatios, shifterRange, shifterRanges } = chip;
  const leastBar = new Float64Array(mesh.cells);
  const leastCross = new Float64Array(mesh.cells);
  for (let cell = 0; cell < mesh.cells; cell++) {
    const { first, second } = ratiosOfCell(style, couplingRatios, cell);
    leastBar[cell] = cosineOfSum(first, second);
    leastCross[cell] = sineOfDifference(first, second);
    const range = shifterRanges.get(shifterIndicesOfCell(chip, cell).internal) ?? shifterRange;
    if (range === null) continue;
    const [least, greatest] = halfSineSquares(range);
    const span = 4 * Math.sqrt(first * (1 - first) * second * (1 - second));
    const [barMissed, crossMissed] =
      style.splitterForm === 'real' ? [1 - greatest, least] : [least, 1 - greatest];
    leastBar[cell] = Math.sqrt(leastBar[cell]! ** 2 + span * barMissed);
    leastCross[cell] = Math.sqrt(leastCross[cell]! ** 2 + span * crossMissed);
  }
  return { leastBar, leastCross };
}

/**
 * What stands beside the factor of each cell of three splitters where its reach is judged: diag(e^{i d})
 * S(c)^dag on its right, or S(c)^dag diag(e^{i d}) on its left for an external phase at the output.
 * @param carriedIn the phases e^{i d} that each cell meets in the carrying sweep, 4 numbers a cell: upper
 * re, im, lower
 */
export function besideFactors(chip: Chip, carriedIn: Float64Array): BesideFactors {
  const { mesh, style, couplingRatios } = chip;
  const matrices = new Float64Array(8 * mesh.cells);
  for (let cell = 0; cell < mesh.cells; cell++) {
    const matrix = matrices.subarray(8 * cell, 8 * (cell + 1));
    matrix.set(carriedIn.subarray(4 * cell, 4 * cell + 2), 0);
    matrix.set(carriedIn.subarray(4 * cell + 2, 4 * cell + 4), 6);
    const { outer } = ratiosOfCell(style, couplingRatios, cell);
    if (outer !== null) applyOuterSplitterInPlace(matrix, style, outer, true);
  }
  return { matrices, onLeft: externalAtOutput(style) };
}

/** Least and greatest sin^2(theta/2) over a range of theta. */
function halfSineSquares([low, high]: PhaseRange): [least: number, greatest: number] {
  const holds = (angle: number): boolean =>
    Math.ceil((low - angle) / (2 * Math.PI)) <= Math.floor((high - angle) / (2 * Math.PI));
  const ends = [low, high].map((theta) => Math.sin(theta / 2) ** 2) as [number, number];
  return [holds(0) ? 0 : Math.min(...ends), holds(Math.PI) ? 1 : Math.max(...ends)];
}
