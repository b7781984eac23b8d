import { sortedQuantile } from '../statistics/quantiles.js';
import type { JudgedValues, ValueWindow } from './valueWindow.js';

export interface HistogramBin {
  readonly low: number;
  readonly high: number;
  readonly count: number;
  /** Whether the chips of this bin pass; true without a threshold. */
  readonly passes: boolean;
}

const FEWEST = 10;
const MOST = 60;

/**
 * Bins of equal width over the window (in the logarithm on a logarithmic axis), empty ones included. Their
 * width is that of Freedman and Diaconis (Z. Wahrsch. Verw. Geb. 57, 453 (1981)), held to 10 to 60 bins over
 * the values; the threshold is an edge, so that no bin holds both good and bad chips, and where values reach
 * up to 1 or down to 0 so is that limit.
 * @param sorted ascending
 */
export function histogramBins(
  sorted: Float64Array,
  window: ValueWindow,
  { threshold, thresholdIsUpperLimit = false }: JudgedValues,
): HistogramBin[] {
  const toAxis = window.log ? Math.log10 : (value: number): number => value;
  const shown = sorted.subarray(window.below, sorted.length - window.above);
  const passes = (value: number): boolean =>
    threshold === undefined || (thresholdIsUpperLimit ? value <= threshold : value >= threshold);
  const onAxis = threshold !== undefined && threshold >= window.low && threshold <= window.high;
  const edges = onAxis ? toAxis(threshold) : null;
  const { anchor, step } = grid(shown.map(toAxis), window, edges);
  const indexOf = (value: number): number => {
    const place = (toAxis(value) - anchor) / step;
    const index = thresholdIsUpperLimit ? Math.ceil(place) - 1 : Math.floor(place);
    // Rounding must not carry a value over the threshold.
    if (!onAxis) return index;
    return passes(value) === thresholdIsUpperLimit ? Math.min(index, -1) : Math.max(index, 0);
  };
  const first = Math.round((toAxis(window.low) - anchor) / step - 0.499);
  const last = Math.max(first, Math.round((toAxis(window.high) - anchor) / step + 0.499) - 1);
  const counts = new Array<number>(last - first + 1).fill(0);
  for (const value of shown) counts[Math.max(first, Math.min(last, indexOf(value))) - first]!++;
  const edge = (index: number): number => {
    if (onAxis && index === 0) return threshold;
    const place = anchor + index * step;
    return window.log ? 10 ** place : Math.max(window.limits[0], Math.min(window.limits[1], place));
  };
  return counts.map((count, i) => {
    const [low, high] = [edge(first + i), edge(first + i + 1)];
    return { low, high, count, passes: passes(thresholdIsUpperLimit ? high : low) };
  });
}

interface Grid {
  /**
   * On the axis, that is in the logarithm on a logarithmic one; bin k lies from anchor + k step to the next.
   */
  readonly anchor: number;
  readonly step: number;
}

function grid(places: Float64Array, window: ValueWindow, threshold: number | null): Grid {
  const toAxis = window.log ? Math.log10 : (value: number): number => value;
  const [least, greatest] = [places[0]!, places[places.length - 1]!];
  const windowRange = toAxis(window.high) - toAxis(window.low);
  const range = greatest - least;
  // Equal values: one bin of a window that has some.
  const step = range > windowRange * 1e-3 ? stepFor(places, range) : windowRange / FEWEST;
  const limit = limitWithin(step, least, greatest, window);
  if (threshold === null) return { anchor: limit ?? least, step };
  if (limit === null) return { anchor: threshold, step };
  const bins = Math.round(Math.abs(limit - threshold) / step);
  return { anchor: threshold, step: bins >= 1 ? Math.abs(limit - threshold) / bins : step };
}

function stepFor(places: Float64Array, range: number): number {
  const spread = sortedQuantile(places, 0.75) - sortedQuantile(places, 0.25);
  const wished = (2 * spread) / Math.cbrt(places.length);
  const bins = wished > 0 ? Math.ceil(range / wished) : MOST;
  return range / Math.max(FEWEST, Math.min(MOST, bins));
}

/** The limit of the figure of merit that the values come as near as one bin, if any. */
function limitWithin(
  step: number,
  least: number,
  greatest: number,
  { log, limits }: ValueWindow,
): number | null {
  if (log) return null;
  if (limits[1] - greatest < step) return limits[1];
  return least - limits[0] < step ? limits[0] : null;
}
