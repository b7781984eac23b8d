/** The bar powers that a cell can attain by its internal phase, both ends included. */
export interface Reach {
  readonly low: number;
  readonly high: number;
}

/**
 * Reach of a cell whose splitters have the given coupling ratios sin^2 a, sin^2 b: from cos^2(a+b) to
 * cos^2(a-b). Bandyopadhyay, Hamerly, Englund, Optica 8, 1247 (2021). The same for symmetric and real
 * splitters.
 */
export function cellReach(firstRatio: number, secondRatio: number): Reach {
  return {
    low: cosineOfSum(firstRatio, secondRatio) ** 2,
    high: cosineOfDifference(firstRatio, secondRatio) ** 2,
  };
}

/** |cos(a+b)|, the least bar amplitude. */
export function cosineOfSum(firstRatio: number, secondRatio: number): number {
  return Math.abs(Math.sqrt((1 - firstRatio) * (1 - secondRatio)) - Math.sqrt(firstRatio * secondRatio));
}

/** |sin(a-b)|, the least cross amplitude. */
export function sineOfDifference(firstRatio: number, secondRatio: number): number {
  return Math.abs(Math.sqrt(firstRatio * (1 - secondRatio)) - Math.sqrt((1 - firstRatio) * secondRatio));
}

function cosineOfDifference(firstRatio: number, secondRatio: number): number {
  return Math.sqrt((1 - firstRatio) * (1 - secondRatio)) + Math.sqrt(firstRatio * secondRatio);
}
