import type { Chip } from '../chip/Chip.js';
import { cellReach } from '../chip/reach.js';
import { decompose } from '../decompose/decompose.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';

/** What a target asks of a cell, against what the cell can do. */
export interface CellMargin {
  /** Index (from 0) of the cell. */
  readonly cellIndex: number;
  /** Bar power that the target asks for. */
  readonly wanted: number;
  /** Least and greatest bar power in reach. */
  readonly low: number;
  readonly high: number;
  /** Bar power to the nearer end of the reach; below 0 where the cell cannot do it. */
  readonly margin: number;
}

/**
 * The bar power that a target asks of each cell when nothing is passed on, against the cell's reach, in cell
 * order (Bandyopadhyay, Hamerly, Englund, Optica 8, 1247 (2021)). A mesh does a target in one way only, up to
 * phases, so that these are what any exact program needs.
 * @throws RangeError when target and chip differ in size
 */
export function cellMargins(chip: Chip, target: ComplexMatrix): CellMargin[] {
  const { cosine } = decompose(target, chip.mesh);
  return Array.from(cosine, (bar, cellIndex) => {
    const wanted = bar * bar;
    const { low, high } = cellReach(
      chip.couplingRatios[2 * cellIndex]!,
      chip.couplingRatios[2 * cellIndex + 1]!,
    );
    return { cellIndex, wanted, low, high, margin: Math.min(wanted - low, high - wanted) };
  });
}
