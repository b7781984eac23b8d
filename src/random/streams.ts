/**
 * The stream number of each use of random numbers, in one place: two uses with the same seed (a random
 * target and the splitter errors of the chip it is put on, say) must never draw the same numbers. Append;
 * never renumber, since a number fixes what a seed means.
 */
export const STREAMS = {
  haarUnitary: 1,
  spectralNormStart: 2,
  trialTarget: 3,
  splitterRatios: 4,
  splitterAngles: 5,
  dieBias: 6,
  phaseErrors: 7,
  splitterLosses: 8,
  refinementKick: 9,
  refinementStart: 10,
} as const;
