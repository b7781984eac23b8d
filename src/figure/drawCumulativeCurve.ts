import { bisectLeft, bisectRight } from 'd3-array';
import { area as areaShape, curveStepAfter, curveStepBefore, line as lineShape } from 'd3-shape';
import { clopperPearson } from '../statistics/binomialInterval.js';
import type { ValueFigureOptions } from './drawHistogram.js';
import { countPassing, thresholdText } from './drawHistogram.js';
import { limitText, shareWithInterval } from './numberText.js';
import { linearAxis, logAxis } from './plotAxis.js';
import type { PlotArea } from './plotFrame.js';
import { drawPlot, horizontalRoom, verticalRoom } from './plotFrame.js';
import { BAND_COLOUR, CURVE_WIDTH, PASS_COLOUR } from './plotStyle.js';
import type { SvgPart } from './SvgPage.js';
import type { ValueWindow } from './valueWindow.js';
import { stragglerNote, valueWindow } from './valueWindow.js';

/** What may be chosen of a cumulative curve. */
export interface CumulativeCurveOptions extends ValueFigureOptions {
  /** Confidence of the band, at each value by itself; 0.95 by default. */
  readonly confidence?: number;
}

/** More steps than this are finer than print. */
const MOST_STEPS = 400;
/** Beyond the values on a linear axis, in shares of their range. */
const PADDING = 0.03;

interface CurvePoint {
  readonly value: number;
  readonly share: number;
  readonly low: number;
  readonly high: number;
}

/**
 * The share of chips that reach at least a value (at most, for an error), against that value, as the text of
 * an SVG document: the empirical distribution with Clopper and Pearson's band. The threshold has a line, and
 * its share is written over it with the interval. Thinned to 400 steps. Cost: a sort and 400 intervals.
 * @param values one per trial; left as they are
 * @throws RangeError for no values or values that are not finite, a log axis for values that are not
 *   positive, or a confidence outside (0, 1); InputError `figure/width`
 */
export function drawCumulativeCurve(values: Float64Array, options: CumulativeCurveOptions): string {
  const { confidence = 0.95, thresholdIsUpperLimit: atMost = false } = options;
  const sorted = values.slice().sort();
  const window = padded(valueWindow(sorted, options));
  const points = curvePoints(sorted, window, atMost, confidence);
  const axis = window.log ? logAxis : linearAxis;
  const share = thresholdShare(sorted, options, confidence);
  const band = `${limitText(100 * confidence)} % interval`;
  const bound = atMost ? 'most' : 'least';
  const what = `Share of ${sorted.length} chips whose ${options.label} is at ${bound} the value on the axis`;
  return drawPlot(
    {
      name: `Cumulative curve: ${options.label}`,
      description: `${what}, with its ${band}.${share === null ? '' : ` ${share}.`}`,
      xLabel: options.label,
      yLabel: `share of chips at ${atMost ? 'or below' : 'or above'} the value (%)`,
      xAxis: (length) => axis(window.low, window.high, length, horizontalRoom),
      yAxis: (length) => linearAxis(0, 100, length, verticalRoom),
      key: [
        {
          kind: 'line',
          colour: PASS_COLOUR,
          band: BAND_COLOUR,
          text: `${sorted.length} ${sorted.length === 1 ? 'chip' : 'chips'}, ${band}`,
        },
      ],
      mark: share === null ? undefined : { value: options.threshold!, text: share },
      notes: stragglerNote(window),
      draw: (group, area) => drawCurve(group, area, points, atMost),
    },
    options,
  );
}

function thresholdShare(
  sorted: Float64Array,
  options: ValueFigureOptions,
  confidence: number,
): string | null {
  if (options.threshold === undefined) return null;
  const passing = countPassing(sorted, options);
  const interval = clopperPearson(passing, sorted.length, confidence);
  return `${thresholdText(options)}: ${shareWithInterval(passing / sorted.length, interval)}`;
}

function padded(window: ValueWindow): ValueWindow {
  const { low, high, log, limits } = window;
  if (log) {
    const factor = (high / low) ** PADDING;
    return { ...window, low: low / factor, high: high * factor };
  }
  const room = PADDING * (high - low);
  return { ...window, low: Math.max(limits[0], low - room), high: Math.min(limits[1], high + room) };
}

function curvePoints(
  sorted: Float64Array,
  { low, high }: ValueWindow,
  atMost: boolean,
  confidence: number,
): CurvePoint[] {
  const trials = sorted.length;
  const stride = Math.max(1, trials / MOST_STEPS);
  const inside = new Set([low]);
  for (let place = 0; place < trials; place += stride) {
    const value = sorted[Math.floor(place)]!;
    if (value >= low && value <= high) inside.add(value);
  }
  const last = sorted[trials - 1]!;
  if (last >= low && last <= high) inside.add(last);
  inside.add(high);
  return [...inside].map((value) => {
    const passing = atMost ? bisectRight(sorted, value) : trials - bisectLeft(sorted, value);
    return { value, share: passing / trials, ...clopperPearson(passing, trials, confidence) };
  });
}

function drawCurve(group: SvgPart, { x, y }: PlotArea, points: readonly CurvePoint[], atMost: boolean): void {
  // "At least v" still holds at the value itself and falls behind it; "at most v" rises at it.
  const steps = atMost ? curveStepAfter : curveStepBefore;
  const band = areaShape<CurvePoint>()
    .x(({ value }) => x(value))
    .y0(({ low }) => y(100 * low))
    .y1(({ high }) => y(100 * high))
    .curve(steps)
    .digits(3);
  const line = lineShape<CurvePoint>()
    .x(({ value }) => x(value))
    .y(({ share }) => y(100 * share))
    .curve(steps)
    .digits(3);
  group.add('path', { id: 'band', d: band([...points]) ?? '', fill: BAND_COLOUR });
  group.add('path', {
    'id': 'curve',
    'd': line([...points]) ?? '',
    'fill': 'none',
    'stroke': PASS_COLOUR,
    'stroke-width': CURVE_WIDTH,
  });
}
