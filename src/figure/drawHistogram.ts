import type { CurveFigureOptions } from './figurePage.js';
import type { HistogramBin } from './histogramBins.js';
import { histogramBins } from './histogramBins.js';
import { limitText, shareText } from './numberText.js';
import { linearAxis, logAxis } from './plotAxis.js';
import type { PlotArea, PlotMark } from './plotFrame.js';
import { drawPlot, horizontalRoom, verticalRoom } from './plotFrame.js';
import { FAIL_COLOUR, HAIRLINE, INK, PASS_COLOUR } from './plotStyle.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';
import type { JudgedValues } from './valueWindow.js';
import { stragglerNote, valueWindow } from './valueWindow.js';

/** What may be chosen of a figure of values. */
export interface ValueFigureOptions extends JudgedValues, CurveFigureOptions {
  /** Words below the axis: the quantity, and its unit if it has one. */
  readonly label: string;
}

/**
 * How often values occur among the trials, as the text of an SVG document. Bins that pass the threshold are
 * dark, the others light; the threshold has a line, and the share that passes is written over it. Cost: a
 * sort.
 * @param values one per trial; left as they are
 * @throws RangeError for no values or values that are not finite, or a log axis for values that are not
 *   positive; InputError `figure/width`
 */
export function drawHistogram(values: Float64Array, options: ValueFigureOptions): string {
  const sorted = values.slice().sort();
  const window = valueWindow(sorted, options);
  const bins = histogramBins(sorted, window, options);
  const most = Math.max(...bins.map(({ count }) => count));
  const low = bins[0]!.low;
  const high = bins[bins.length - 1]!.high;
  const axis = window.log ? logAxis : linearAxis;
  return drawPlot(
    {
      name: `Histogram: ${options.label}`,
      description: describeHistogram(sorted, options),
      xLabel: options.label,
      yLabel: 'chips in a bin',
      xAxis: (length) => axis(low, high, length, horizontalRoom),
      yAxis: (length) => linearAxis(0, 1.03 * most, length, verticalRoom, true),
      mark: thresholdMark(sorted, options),
      notes: stragglerNote(window),
      draw: (group, area) => drawBars(group, area, bins),
    },
    options,
  );
}

/** Number of values that pass the threshold. */
export function countPassing(
  sorted: Float64Array,
  { threshold, thresholdIsUpperLimit }: JudgedValues,
): number {
  if (threshold === undefined) return sorted.length;
  let passing = 0;
  for (const value of sorted)
    if (thresholdIsUpperLimit === true ? value <= threshold : value >= threshold) passing++;
  return passing;
}

function thresholdMark(sorted: Float64Array, options: JudgedValues): PlotMark | undefined {
  if (options.threshold === undefined) return undefined;
  const share = shareText(countPassing(sorted, options), sorted.length);
  return { value: options.threshold, text: `${thresholdText(options)}: ${share} of chips` };
}

/** `≥ 0.99` */
export function thresholdText({ threshold = 0, thresholdIsUpperLimit = false }: JudgedValues): string {
  return `${thresholdIsUpperLimit ? '≤' : '≥'} ${limitText(threshold)}`;
}

function describeHistogram(sorted: Float64Array, options: ValueFigureOptions): string {
  const range = `from ${limitText(sorted[0]!)} to ${limitText(sorted[sorted.length - 1]!)}`;
  const what = `Histogram of ${options.label} of ${sorted.length} chips, ${range}.`;
  if (options.threshold === undefined) return what;
  return `${what} ${countPassing(sorted, options)} of them are ${thresholdText(options)}.`;
}

function drawBars(group: SvgPart, { x, y }: PlotArea, bins: readonly HistogramBin[]): void {
  for (const passes of [false, true]) {
    const bars = bins.filter((bin) => bin.count > 0 && bin.passes === passes);
    if (bars.length === 0) continue;
    const outline = bars.map(({ low, high, count }) => {
      const [left, right, top, bottom] = [x(low), x(high), y(count), y(0)].map(rounded);
      return `M${left} ${bottom}V${top}H${right}V${bottom}Z`;
    });
    group.add('path', {
      'id': passes ? 'passing' : 'failing',
      'd': outline.join(''),
      'fill': passes ? PASS_COLOUR : FAIL_COLOUR,
      'stroke': INK,
      'stroke-width': HAIRLINE,
    });
  }
}
