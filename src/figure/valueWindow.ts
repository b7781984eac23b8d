import { quantityText } from './numberText.js';
import { sortedQuantile } from '../statistics/quantiles.js';

/** How a figure of merit is judged and shown. */
export interface JudgedValues {
  /** The limit that a good chip reaches. */
  readonly threshold?: number;
  /** Whether good means at most the threshold (an error) and not at least (a fidelity, the default). */
  readonly thresholdIsUpperLimit?: boolean;
  /**
   * Logarithmic values axis. By default where all are positive and their middle nine tenths span more than
   * two decades.
   */
  readonly logX?: boolean;
}

/** The part of the values axis that a figure shows. */
export interface ValueWindow {
  readonly low: number;
  readonly high: number;
  readonly log: boolean;
  /** Number of values outside on either side; far stragglers would squeeze all others together. */
  readonly below: number;
  readonly above: number;
  /**
   * Values all in [0, 1] or all >= 0 are of a figure of merit that cannot leave that: the axis does not
   * either.
   */
  readonly limits: readonly [low: number, high: number];
}

/**
 * Share of the values left out of the middle on either side, and how many times its width the window adds
 * there.
 */
const OUTER_SHARE = 0.005;
const ROOM_BEYOND_CORE = 0.5;
/** The threshold is on the axis unless it is farther away than so many times the range of the values. */
const FAR = 1.5;
/** Beyond a threshold that lies outside the values, in shares of the axis. */
const ROOM_BEYOND_THRESHOLD = 0.06;
const EDGE_DIGITS = 6;
const LOG_FROM_RATIO = 100;

/**
 * The window for sorted values: all of them and the threshold, but neither stragglers nor a threshold that
 * would leave the rest no room.
 * @param sorted ascending
 * @throws RangeError for no values, values that are not finite, or a log axis for values that are not
 *   positive
 */
export function valueWindow(sorted: Float64Array, judged: JudgedValues): ValueWindow {
  requireFinite(sorted, judged.threshold);
  const log = judged.logX ?? spansDecades(sorted);
  if (log && !(sorted[0]! > 0)) throw new RangeError('a logarithmic axis needs values larger than 0');
  const limits = limitsOf(sorted);
  const toAxis = log ? Math.log10 : (value: number): number => value;
  const fromAxis = log ? (place: number): number => 10 ** place : (place: number): number => place;
  const [coreLow, coreHigh] = coreOf(sorted, toAxis);
  const reach =
    judged.threshold !== undefined && (!log || judged.threshold > 0) ? [toAxis(judged.threshold)] : [];
  const [low, high] = withThreshold(coreLow, coreHigh, reach, log);
  const clippedLow = log ? fromAxis(low) : Math.max(limits[0], low);
  const clippedHigh = Math.min(limits[1], fromAxis(high));
  const below = sorted.findIndex((value) => value >= clippedLow - rounding(clippedLow));
  const above =
    sorted.length - 1 - sorted.findLastIndex((value) => value <= clippedHigh + rounding(clippedHigh));
  return { low: clippedLow, high: clippedHigh, log, below, above, limits };
}

/** In words, how many values the figure does not show. */
export function stragglerNote({ below, above, low, high }: ValueWindow): string[] {
  const notes: string[] = [];
  if (below > 0) notes.push(`Not shown: ${below} below ${quantityText(low, EDGE_DIGITS)}.`);
  if (above > 0) notes.push(`Not shown: ${above} above ${quantityText(high, EDGE_DIGITS)}.`);
  return notes;
}

function requireFinite(sorted: Float64Array, threshold: number | undefined): void {
  if (!(sorted.length >= 1)) throw new RangeError('there are no values to draw');
  if (!sorted.every(Number.isFinite)) throw new RangeError('a value to draw is not a number');
  if (threshold !== undefined && !Number.isFinite(threshold)) {
    throw new RangeError(`a threshold cannot be ${threshold}`);
  }
}

function spansDecades(sorted: Float64Array): boolean {
  if (!(sorted[0]! > 0)) return false;
  return sortedQuantile(sorted, 0.95) > LOG_FROM_RATIO * sortedQuantile(sorted, 0.05);
}

function limitsOf(sorted: Float64Array): [number, number] {
  const low = sorted[0]! >= 0 ? 0 : -Infinity;
  return [low, low === 0 && sorted[sorted.length - 1]! <= 1 ? 1 : Infinity];
}

/** Powers of logarithms come back with an error of the last digits. */
function rounding(value: number): number {
  return 1e-12 * Math.abs(value);
}

function coreOf(sorted: Float64Array, toAxis: (value: number) => number): [number, number] {
  const [least, greatest] = [toAxis(sorted[0]!), toAxis(sorted[sorted.length - 1]!)];
  const low = toAxis(sortedQuantile(sorted, OUTER_SHARE));
  const high = toAxis(sortedQuantile(sorted, 1 - OUTER_SHARE));
  const room = ROOM_BEYOND_CORE * (high - low);
  const [trimmedLow, trimmedHigh] = [Math.max(least, low - room), Math.min(greatest, high + room)];
  const worthIt = trimmedHigh > trimmedLow && greatest - least > 2 * (trimmedHigh - trimmedLow);
  return worthIt ? [trimmedLow, trimmedHigh] : [least, greatest];
}

function withThreshold(
  low: number,
  high: number,
  threshold: readonly number[],
  log: boolean,
): [number, number] {
  // Ranges of a few rounding errors are no range.
  const least = log ? 1e-9 : 1e-13 * Math.max(Math.abs(low), Math.abs(high));
  const same = !(high - low > least);
  const range = same ? Infinity : high - low;
  const near = threshold.filter((place) => Math.max(low - place, place - high) <= FAR * range);
  const [from, to] = [Math.min(low, ...near), Math.max(high, ...near)];
  const room = ROOM_BEYOND_THRESHOLD * (to - from);
  // A single value, too, stands better inside than on the edge.
  const [roomLow, roomHigh] = [same || from < low ? room : 0, same || to > high ? room : 0];
  if (to - from > least) return [from - roomLow, to + roomHigh];
  const half = log ? 0.5 : Math.abs(low) * 0.005 || 0.5;
  return [low - half, high + half];
}
