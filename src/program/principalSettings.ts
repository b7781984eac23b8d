import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { decompose } from '../decompose/decompose.js';
import { simulate } from '../simulate/simulate.js';
import { carryingSweep } from './carryingSweep.js';

/**
 * Settings that send light the same way with the phases that a plain program would have: internal ones in [0,
 * pi], the others in [0, 2 pi), or within the shifters' ranges. What a chip does without its losses is a target
 * that every cell of it can do, in one way only up to phases, so that programming it again leads there. A search
 * may end at a phase just short of a whole turn, which drives a heater hard for nothing.
 *
 * The light is the same to rounding where cells have two splitters, the shifters have no loss and none of them is
 * short of range, and where there are port shifters to take up what is left; elsewhere compare before use. (Cells
 * with three splitters do a target in several ways, not all of which are in reach.)
 */
export function principalSettings(chip: Chip, settings: Settings): Settings {
  const ones = new Float64Array(chip.mesh.modes).fill(1);
  const lossless: Chip = {
    ...chip,
    loss: { splitter: 1, shifter: 1, column: 1, input: ones, output: ones },
    cellLoss: null,
  };
  return carryingSweep(chip, decompose(simulate(lossless, settings), chip.mesh)).settings;
}
