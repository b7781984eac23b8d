import type { Chip } from '../chip/Chip.js';
import { decompose } from '../decompose/decompose.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Program } from './carryingSweep.js';
import { carryingSweep } from './carryingSweep.js';

/** A target's program for the chip as it is, and the one that takes the chip for ideal. */
export interface ChipPrograms {
  readonly program: Program;
  /**
   * The phases of a chip with all splitters at 1/2; null when this chip's are, and both would be the same.
   */
  readonly uncorrected: Program | null;
}

/**
 * The phase of every shifter of a chip for a target: nulling on the chip's layout, then the carrying sweep
 * with the chip's cell style and its own splitter ratios. Exact when every cell is in reach and no shifter
 * out of range.
 * @param target N x N unitary (within the precision wanted of the result), N the number of the chip's ports
 * @throws RangeError when target and chip differ in size
 */
export function programChip(chip: Chip, target: ComplexMatrix): ChipPrograms {
  const factors = decompose(target, chip.mesh);
  const program = carryingSweep(chip, factors);
  if (chip.couplingRatios.every((ratio) => ratio === 0.5)) return { program, uncorrected: null };
  const nominal = new Float64Array(chip.couplingRatios.length).fill(0.5);
  return { program, uncorrected: carryingSweep(chip, factors, nominal) };
}
