import { ratiosOfCell, splitterAmplitude } from './cellSplitters.js';
import { applyOuterSplitterInPlace, writeSplitArms } from './cellTransfer.js';
import type { Chip, ExternalGuide, InternalArm } from './Chip.js';

/** Numbers of a cell's 2x2 matrix: 11 re, im, 12, 21, 22. */
const CELL = 8;

/**
 * Transfer matrices of all cells, with all their losses, and their derivatives by the cells' two phases; 8
 * numbers a cell: T11 re, im, T12, T21, T22.
 */
export interface CellSlopes {
  readonly transfer: Float64Array;
  readonly byInternal: Float64Array;
  readonly byExternal: Float64Array;
}

/** Writes a cell's (index from 0) matrix and its derivatives for its two phases. */
export type WriteCellSlopes = (slopes: CellSlopes, cell: number, internal: number, external: number) => void;

/**
 * Makes the one function that knows what the phases of a chip's cells do to their matrices.
 *
 * A cell is T = (u A + l B) with the external phase's factor on a column or row; u and l are the factors of
 * the arms, A and B the splitters around one arm alone, which are reckoned once. So T is linear in each factor
 * that a phase moves, and a derivative by a phase is the part that it moves times i (for a differential pair
 * times i/2 and -i/2).
 */
export function createCellSlopes(chip: Chip): WriteCellSlopes {
  const { style, loss, couplingRatios } = chip;
  const aroundUpper = aroundArm(chip, 0);
  const aroundLower = aroundArm(chip, 1);
  const [upperShare, lowerShare] = ARM_SHARES[style.internal];
  const [onePlace, otherPlace] = EXTERNAL_PLACES[style.external];
  return (slopes, cell, internal, external) => {
    const { transfer, byInternal, byExternal } = slopes;
    const at = CELL * cell;
    const ur = upperShare === 0 ? 1 : loss.shifter * Math.cos(upperShare * internal);
    const ui = upperShare === 0 ? 0 : loss.shifter * Math.sin(upperShare * internal);
    const lr = lowerShare === 0 ? 1 : loss.shifter * Math.cos(lowerShare * internal);
    const li = lowerShare === 0 ? 0 : loss.shifter * Math.sin(lowerShare * internal);
    const er = loss.shifter * Math.cos(external);
    const ei = loss.shifter * Math.sin(external);
    for (let k = at; k < at + CELL; k += 2) {
      const a = aroundUpper[k]!;
      const b = aroundUpper[k + 1]!;
      const c = aroundLower[k]!;
      const d = aroundLower[k + 1]!;
      const upperRe = ur * a - ui * b;
      const upperIm = ur * b + ui * a;
      const lowerRe = lr * c - li * d;
      const lowerIm = lr * d + li * c;
      const re = upperRe + lowerRe;
      const im = upperIm + lowerIm;
      const slopeRe = -(upperShare * upperIm + lowerShare * lowerIm);
      const slopeIm = upperShare * upperRe + lowerShare * lowerRe;
      if (k - at === onePlace || k - at === otherPlace) {
        transfer[k] = er * re - ei * im;
        transfer[k + 1] = er * im + ei * re;
        byInternal[k] = er * slopeRe - ei * slopeIm;
        byInternal[k + 1] = er * slopeIm + ei * slopeRe;
        byExternal[k] = -transfer[k + 1]!;
        byExternal[k + 1] = transfer[k]!;
      } else {
        transfer[k] = re;
        transfer[k + 1] = im;
        byInternal[k] = slopeRe;
        byInternal[k + 1] = slopeIm;
        byExternal[k] = 0;
        byExternal[k + 1] = 0;
      }
    }
    if (style.splitters === 2) return;
    // A third splitter is multiplied into all three: no phase moves it.
    const outer = ratiosOfCell(style, couplingRatios, cell).outer!;
    applyOuterSplitterInPlace(transfer, style, outer, false, at);
    applyOuterSplitterInPlace(byInternal, style, outer, false, at);
    applyOuterSplitterInPlace(byExternal, style, outer, false, at);
  };
}

/** What of theta is on the upper and on the lower arm. */
const ARM_SHARES: Readonly<Record<InternalArm, readonly [upper: number, lower: number]>> = {
  upper: [1, 0],
  lower: [0, 1],
  differential: [1 / 2, -1 / 2],
};

/** Where in a cell's 8 numbers the two entries stand that pass the external shifter. */
const EXTERNAL_PLACES: Readonly<Record<ExternalGuide, readonly [number, number]>> = {
  'upper-input': [0, 4],
  'lower-input': [2, 6],
  'upper-output': [0, 2],
  'lower-output': [4, 6],
};

/** The two splitters around every cell's arms, with the losses of all, and light on one arm alone. */
function aroundArm(chip: Chip, arm: 0 | 1): Float64Array {
  const { mesh, style, couplingRatios } = chip;
  const result = new Float64Array(CELL * mesh.cells);
  const arms = new Float64Array(4);
  for (let cell = 0; cell < mesh.cells; cell++) {
    arms[2 * arm] = splitterAmplitude(chip, cell);
    const place = result.subarray(CELL * cell, CELL * (cell + 1));
    const { first, second } = ratiosOfCell(style, couplingRatios, cell);
    writeSplitArms(place, style.splitterForm, first, second, arms);
  }
  return result;
}
