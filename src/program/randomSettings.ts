import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { settingsFromPhases, shifterCount } from '../chip/shifters.js';
import { randomStream } from '../random/RandomStream.js';
import { STREAMS } from '../random/streams.js';

/**
 * Settings with every phase anywhere in its range (a whole turn where it has none), always the same ones for the
 * same number: starts for a search that may end in a poor local minimum.
 * @param number from 0
 */
export function randomSettings(chip: Chip, number: number): Settings {
  const random = randomStream(0, STREAMS.refinementStart, number);
  const phases = Float64Array.from({ length: shifterCount(chip) }, (_, index) => {
    const [low, high] = chip.shifterRanges.get(index) ?? chip.shifterRange ?? [0, 2 * Math.PI];
    return low + (high - low) * random.uniform();
  });
  return settingsFromPhases(chip, phases);
}
