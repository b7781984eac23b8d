import type { CellStyle, Chip } from './Chip.js';
import { externalAtOutput } from './Chip.js';

/** The coupling ratios of one cell by what its splitters do. */
export interface CellRatios {
  /** The splitter that the light meets before the arms of the internal phase, and the one behind them. */
  readonly first: number;
  readonly second: number;
  /**
   * The third splitter, on the far side of the external phase: at the cell's input where the external phase
   * is at the input, else at its output. Null for a cell of two.
   */
  readonly outer: number | null;
}

/** Where a cell's ratios stand among those of all splitters, which are kept as the light meets them. */
export interface SplitterPlaces {
  /** Splitters of a cell. */
  readonly perCell: 2 | 3;
  /** Offset of the splitter before the arms; that behind them is the next. */
  readonly first: 0 | 1;
  /** Offset of the third splitter; null for a cell of two. */
  readonly outer: 0 | 2 | null;
}

/**
 * The places for a style: outer, first, second for an external phase at the input; first, second, outer for
 * one at the output.
 */
export function splitterPlaces(style: CellStyle): SplitterPlaces {
  if (style.splitters === 2) return { perCell: 2, first: 0, outer: null };
  return externalAtOutput(style) ? { perCell: 3, first: 0, outer: 2 } : { perCell: 3, first: 1, outer: 0 };
}

/** Number of splitters of a chip. */
export function splitterCount({ style, mesh }: Pick<Chip, 'style' | 'mesh'>): number {
  return style.splitters * mesh.cells;
}

/** The ratios of a cell (index from 0), out of those of all splitters. */
export function ratiosOfCell(style: CellStyle, couplingRatios: Float64Array, cell: number): CellRatios {
  const { perCell, first, outer } = splitterPlaces(style);
  const at = perCell * cell;
  return {
    first: couplingRatios[at + first]!,
    second: couplingRatios[at + first + 1]!,
    outer: outer === null ? null : couplingRatios[at + outer]!,
  };
}

/** Amplitude factor of all splitters of a cell (index from 0) together. */
export function splitterAmplitude({ style, loss, cellLoss }: Chip, cell: number): number {
  return cellLoss ? cellLoss[cell]! : loss.splitter ** style.splitters;
}
