import type { Reach } from './reach.js';

/**
 * What the cells of a mesh can attain, per cell in cell order. Kept as amplitudes, since the bar power of a
 * cell that can nearly be a full bar no longer tells what it misses: 1 - 1e-17 is 1.
 */
export interface MeshReach {
  /** Least |W11| = |W22| of each cell, in [0, 1]. */
  readonly leastBar: Float64Array;
  /** Least |W12| = |W21| of each cell, in [0, 1]; leastBar^2 + leastCross^2 <= 1. */
  readonly leastCross: Float64Array;
  /** What stands beside W where the amplitudes are judged, for cells of three splitters. */
  readonly beside?: BesideFactors;
}

/**
 * A unitary Q of every cell: not W is judged, but W Q, or Q W for `onLeft`. Phases on the other side of W
 * change nothing and are free.
 */
export interface BesideFactors {
  /** 8 numbers a cell: Q11 re, im, Q12, Q21, Q22. */
  readonly matrices: Float64Array;
  readonly onLeft: boolean;
}

/**
 * The reach of a mesh from an interval of bar powers for each cell, in cell order. A cell that cannot be
 * moved has low = high. Near high = 1 an interval says what is missed to half the digits only; `reachOfChip`
 * is not limited so.
 * @throws RangeError for an interval that is not 0 <= low <= high <= 1
 */
export function meshReach(intervals: readonly Reach[]): MeshReach {
  const leastBar = new Float64Array(intervals.length);
  const leastCross = new Float64Array(intervals.length);
  intervals.forEach(({ low, high }, cell) => {
    if (!(low >= 0 && low <= high && high <= 1)) {
      throw new RangeError(`bar powers from ${low} to ${high} (cell ${cell + 1}) are no reach of a cell`);
    }
    leastBar[cell] = Math.sqrt(low);
    leastCross[cell] = Math.sqrt(1 - high);
  });
  return { leastBar, leastCross };
}

/** The reach of cells that can do everything: 50:50 splitters, phases of any size. */
export function fullReach(cells: number): MeshReach {
  const numbers = new Float64Array(2 * cells);
  return { leastBar: numbers.subarray(0, cells), leastCross: numbers.subarray(cells) };
}
