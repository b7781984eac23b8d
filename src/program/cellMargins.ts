import { ratiosOfCell } from '../chip/cellSplitters.js';
import type { Chip } from '../chip/Chip.js';
import { cellReach } from '../chip/reach.js';
import type { Program } from './carryingSweep.js';

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
 * The bar power that a program wants of each cell against the cell's reach, in cell order (Bandyopadhyay,
 * Hamerly, Englund, Optica 8, 1247 (2021)); of a cell with three splitters, that of the two around the arms.
 * For the program that corrects cell by cell this is what any exact program needs, since a mesh of cells with
 * two splitters does a target in one way only, up to phases.
 */
export function cellMargins(chip: Chip, { wantedBar }: Program): CellMargin[] {
  return Array.from(wantedBar, (wanted, cellIndex) => {
    const { first, second } = ratiosOfCell(chip.style, chip.couplingRatios, cellIndex);
    const { low, high } = cellReach(first, second);
    return { cellIndex, wanted, low, high, margin: Math.min(wanted - low, high - wanted) };
  });
}
