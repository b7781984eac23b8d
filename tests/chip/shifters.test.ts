import { describe, expect, it } from 'vitest';
import { idealChip } from '../../src/chip/idealChip.js';
import {
  listShifters,
  phaseOf,
  phasesInOrder,
  settingsFromPhases,
  shifterCount,
} from '../../src/chip/shifters.js';
import { ALL_STYLES } from '../support/styles.js';

describe('phases in the order of the phase table', () => {
  it('are those of the list of shifters, and make the settings again', () => {
    for (const style of ALL_STYLES) {
      for (const portShifters of [true, false]) {
        for (const modes of [1, 2, 5]) {
          const chip = idealChip(modes, { style, portShifters });
          const phases = Float64Array.from({ length: shifterCount(chip) }, (_, k) => k + 0.5);
          const settings = settingsFromPhases(chip, phases);
          const listed = listShifters(chip).map((shifter) => phaseOf(settings, shifter));
          expect(listed).toEqual(Array.from(phases));
          expect(phasesInOrder(chip, settings)).toEqual(phases);
        }
      }
    }
  });

  it('are refused when they are not of the chip', () => {
    const chip = idealChip(3);
    expect(() => settingsFromPhases(chip, new Float64Array(8))).toThrow(RangeError);
    const settings = settingsFromPhases(chip, new Float64Array(9));
    expect(() => phasesInOrder(idealChip(4), settings)).toThrow(RangeError);
    expect(() => phasesInOrder(idealChip(3, { portShifters: false }), settings)).toThrow(RangeError);
  });
});
