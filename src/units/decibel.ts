/** Amplitude factor in (0, 1] of a loss in dB (loss >= 0 attenuates): 10^(-dB/20). */
export function amplitudeFromLossDb(lossDb: number): number {
  return 10 ** (-lossDb / 20);
}

/** A power ratio in dB, negative for attenuation: 10 log10(ratio); -Infinity for 0. */
export function decibelFromPowerRatio(ratio: number): number {
  return 10 * Math.log10(ratio);
}
