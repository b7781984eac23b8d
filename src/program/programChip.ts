import type { Chip } from '../chip/Chip.js';
import { decompose } from '../decompose/decompose.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Program } from './carryingSweep.js';
import { carryingSweep } from './carryingSweep.js';
import { programThroughMesh } from './programThroughMesh.js';
import type { DirectRetuning } from './retunings.js';

/** A target's program for the chip as it is, and the one that takes the chip for ideal. */
export interface ChipPrograms {
  readonly program: Program;
  /** The retuning that `program` comes from: what was asked for, or a lesser one that does as well. */
  readonly retuned: DirectRetuning;
  /** The phases of a chip with all splitters at 1/2; null when `program` is the same. */
  readonly uncorrected: Program | null;
}

/**
 * The phase of every shifter of a chip for a target: nulling on the chip's layout, then the carrying sweep
 * with the chip's cell style and its own splitter ratios. Exact when every cell is in reach and no shifter
 * out of range; how well the others are made good is a matter of the retuning. With `mesh` no chip does worse
 * than with `cell`: the better of the two is taken.
 * @param target N x N unitary (within the precision wanted of the result), N the number of the chip's ports
 * @throws RangeError when target and chip differ in size
 */
export function programChip(
  chip: Chip,
  target: ComplexMatrix,
  retune: DirectRetuning = 'cell',
): ChipPrograms {
  const factors = decompose(target, chip.mesh);
  const nominal = chip.couplingRatios.every((ratio) => ratio === 0.5)
    ? null
    : carryingSweep(chip, factors, new Float64Array(chip.couplingRatios.length).fill(0.5));
  if (retune === 'none' && nominal) return { program: nominal, retuned: 'none', uncorrected: null };
  const cellByCell = carryingSweep(chip, factors);
  const throughMesh = retune === 'mesh' ? programThroughMesh(chip, target, factors, cellByCell) : null;
  if (throughMesh) return { program: throughMesh, retuned: 'mesh', uncorrected: nominal ?? cellByCell };
  return { program: cellByCell, retuned: nominal ? 'cell' : 'none', uncorrected: nominal };
}
