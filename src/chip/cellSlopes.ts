import { applyExternalInPlace, writeArms, writeSplitArms } from './cellTransfer.js';
import type { Chip, InternalArm } from './Chip.js';

/**
 * A cell's transfer matrix and its derivatives by its two phases; 8 numbers each: T11 re, im, T12, T21, T22.
 */
export interface CellSlopes {
  readonly transfer: Float64Array;
  readonly byInternal: Float64Array;
  readonly byExternal: Float64Array;
}

/**
 * Makes a function that writes the transfer matrix of a cell (index from 0) with all its losses, and the
 * matrix's derivatives by the internal and the external phase. The numbers stay until the next call.
 *
 * The matrix is linear in the factors of the arms and in the factor of the external phase, so each derivative
 * is the same formula with a factor's own derivative in its place.
 */
export function createCellSlopes(
  chip: Chip,
): (cell: number, internal: number, external: number) => CellSlopes {
  const { style, couplingRatios, loss, cellLoss } = chip;
  const differential = style.internal === 'differential';
  const arms = new Float64Array(4);
  const slopes: CellSlopes = {
    transfer: new Float64Array(8),
    byInternal: new Float64Array(8),
    byExternal: new Float64Array(8),
  };
  const { transfer, byInternal, byExternal } = slopes;
  return (cell, internal, external) => {
    const first = couplingRatios[2 * cell]!;
    const second = couplingRatios[2 * cell + 1]!;
    const splitters = cellLoss ? cellLoss[cell]! : loss.splitter * loss.splitter;
    const re = loss.shifter * Math.cos(external);
    const im = loss.shifter * Math.sin(external);
    writeArms(arms, style.internal, internal, splitters * loss.shifter);
    // An arm without a shifter has only the splitters' losses.
    if (!differential) arms[style.internal === 'upper' ? 2 : 0] = splitters;
    writeSplitArms(transfer, style.splitterForm, first, second, arms);
    differentiateArms(arms, style.internal);
    writeSplitArms(byInternal, style.splitterForm, first, second, arms);
    // What does not pass the external shifter does not depend on its phase.
    byExternal.set(transfer);
    applyExternalInPlace(byExternal, style.external, 0, 0);
    applyExternalInPlace(transfer, style.external, re, im);
    applyExternalInPlace(byInternal, style.external, re, im);
    for (let k = 0; k < 8; k += 2) {
      const shiftedRe = transfer[k]! - byExternal[k]!;
      byExternal[k] = byExternal[k + 1]! - transfer[k + 1]!;
      byExternal[k + 1] = shiftedRe;
    }
    return slopes;
  };
}

/** Turns the factors of a cell's arms into their derivatives by the internal phase. */
function differentiateArms(arms: Float64Array, internal: InternalArm): void {
  const upper = internal === 'upper' ? 1 : internal === 'lower' ? 0 : 0.5;
  const lower = internal === 'lower' ? 1 : internal === 'upper' ? 0 : -0.5;
  const ur = arms[0]!;
  const lr = arms[2]!;
  arms[0] = -upper * arms[1]!;
  arms[1] = upper * ur;
  arms[2] = -lower * arms[3]!;
  arms[3] = lower * lr;
}
