import { binomialCdf } from './binomialDistribution.js';
import { requireConfidence } from './binomialInterval.js';

/** A quantile of a sample, with the interval for the quantile of what the sample was drawn from. */
export interface Quantile {
  /** The share of the distribution that lies below, in [0, 1]. */
  readonly probability: number;
  readonly value: number;
  /** Ends of the interval; null where the sample is too small to bound the quantile on that side. */
  readonly low: number | null;
  readonly high: number | null;
}

/**
 * The quantile of sorted values, by linear interpolation between the order statistics around (n - 1)
 * probability: definition 7 of Hyndman and Fan (Am. Stat. 50, 361 (1996)), which spreadsheets and NumPy use
 * too.
 * @param sorted ascending, at least one
 * @param probability in [0, 1]
 * @throws RangeError for no value or another probability
 */
export function sortedQuantile(sorted: Float64Array, probability: number): number {
  requireQuantile(sorted, probability);
  const place = (sorted.length - 1) * probability;
  const below = Math.floor(place);
  const lower = sorted[below]!;
  const upper = sorted[Math.min(below + 1, sorted.length - 1)]!;
  return lower === upper ? lower : lower + (place - below) * (upper - lower);
}

/**
 * The quantile with an interval between two of the values themselves. It holds for every distribution: the
 * number of values below the true quantile is binomial, so the ranks are those that a binomial variable
 * leaves with at most half of 1 - confidence on either side (David and Nagaraja, Order Statistics, section
 * 7.1). Cost: two bisections over the ranks.
 * @param sorted ascending, at least one
 * @param confidence larger than 0 and smaller than 1
 * @throws RangeError for no value, or a probability or confidence out of range
 */
export function quantileWithInterval(
  sorted: Float64Array,
  probability: number,
  confidence: number,
): Quantile {
  requireConfidence(confidence);
  const value = sortedQuantile(sorted, probability);
  const trials = sorted.length;
  const tail = (1 - confidence) / 2;
  const lowRank = firstCountAbove(tail, trials, probability);
  const highRank = trials + 1 - firstCountAbove(tail, trials, 1 - probability);
  return {
    probability,
    value,
    low: lowRank >= 1 ? sorted[lowRank - 1]! : null,
    high: highRank <= trials ? sorted[highRank - 1]! : null,
  };
}

/**
 * The least count k for which at most k successes are more probable than `tail`: the k-th value is too high
 * with at most that probability.
 */
function firstCountAbove(tail: number, trials: number, share: number): number {
  let [low, high] = [0, trials];
  while (low < high) {
    const middle = Math.floor((low + high) / 2);
    if (binomialCdf(middle, trials, share) > tail) high = middle;
    else low = middle + 1;
  }
  return low;
}

function requireQuantile(sorted: Float64Array, probability: number): void {
  if (!(sorted.length >= 1)) throw new RangeError('a quantile of no values does not exist');
  if (!(probability >= 0 && probability <= 1)) throw new RangeError(`a probability cannot be ${probability}`);
}
