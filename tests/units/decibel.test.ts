import { describe, expect, it } from 'vitest';
import { amplitudeFromLossDb, decibelFromPowerRatio } from '../../src/units/decibel.js';

describe('decibels', () => {
  it('10 dB are a tenth of the power, 20 dB a tenth of the amplitude', () => {
    expect(amplitudeFromLossDb(0)).toBe(1);
    expect(amplitudeFromLossDb(20)).toBeCloseTo(0.1, 15);
    expect(amplitudeFromLossDb(10) ** 2).toBeCloseTo(0.1, 15);
    expect(decibelFromPowerRatio(0.1)).toBeCloseTo(-10, 14);
    expect(decibelFromPowerRatio(1)).toBe(0);
    expect(decibelFromPowerRatio(0)).toBe(-Infinity);
    // Half the power: 3.0103 dB (10 log10 2, from tables).
    expect(decibelFromPowerRatio(0.5)).toBeCloseTo(-3.010299957, 9);
  });

  it('losses one after another add up', () => {
    expect(amplitudeFromLossDb(0.3) * amplitudeFromLossDb(1.1)).toBeCloseTo(amplitudeFromLossDb(1.4), 15);
  });

  it("are each other's inverse, with the sign of a loss", () => {
    for (const lossDb of [0, 0.01, 0.5, 3, 40]) {
      expect(decibelFromPowerRatio(amplitudeFromLossDb(lossDb) ** 2)).toBeCloseTo(-lossDb, 12);
    }
  });
});
