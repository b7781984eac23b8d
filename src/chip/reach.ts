import type { CellRatios } from './cellSplitters.js';

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

/** What a cell as a whole cannot do, its external phase being free. */
export interface MissedStates {
  readonly cross: boolean;
  readonly bar: boolean;
}

/** Bar powers that differ by less count as the same. */
const SAME_POWER = 1e-12;

/**
 * Whether a cell misses the full cross or bar state. Two splitters: where their reach does not hold the bar
 * power 0 or 1. A third one of ratio sin^2 c, with the external phase free between it and the others, makes
 * bar amplitudes from | |M11| cos c - |M12| sin c | to |M11| cos c + |M12| sin c of what the two do: cross
 * asks for the bar power sin^2 c of them, bar for cos^2 c.
 */
export function missedStates({ first, second, outer }: CellRatios): MissedStates {
  const { low, high } = cellReach(first, second);
  const missed = (power: number): boolean => !(low - SAME_POWER <= power && power <= high + SAME_POWER);
  return { cross: missed(outer ?? 0), bar: missed(1 - (outer ?? 0)) };
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
