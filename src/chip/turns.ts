import type { PhaseRange } from './Chip.js';

const TURN = 2 * Math.PI;
/**
 * Rounding at the ends of a range is no reason to clamp; phases that a person could set never differ by so
 * little.
 */
const SLACK = 1e-12;

/**
 * The angle moved by the fewest whole turns that bring it into the range, or NaN when no number of turns
 * does. Without a range, the angle itself.
 * @param turn what counts as a turn: 2 pi, but 4 pi where a differential pair must come back to the same
 * matrix
 */
export function turnIntoRange(angle: number, range: PhaseRange | null, turn = TURN): number {
  if (range === null) return angle;
  const [low, high] = range;
  const fewest = Math.ceil((low - SLACK - angle) / turn);
  const most = Math.floor((high + SLACK - angle) / turn);
  if (!(fewest <= most)) return NaN;
  const turned = angle + turn * Math.min(Math.max(0, fewest), most);
  return Math.min(Math.max(turned, low), high);
}

/** The end of the range that is nearest to the angle on the circle. */
export function nearestEnd(angle: number, [low, high]: PhaseRange): number {
  return Math.cos(angle - high) > Math.cos(angle - low) ? high : low;
}
