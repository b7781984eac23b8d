import { area as areaShape, line as lineShape } from 'd3-shape';
import type { Interval } from '../statistics/binomialInterval.js';
import type { CurveFigureOptions } from './figurePage.js';
import { limitText, quantityText, shareWithInterval } from './numberText.js';
import type { Axis, LabelRoom } from './plotAxis.js';
import { linearAxis, logAxis } from './plotAxis.js';
import type { PlotArea, PlotMark } from './plotFrame.js';
import { drawPlot, horizontalRoom, verticalRoom } from './plotFrame.js';
import type { KeyEntry } from './plotKey.js';
import { DASHES } from './plotKey.js';
import { BAND_COLOUR, CURVE_WIDTH, HAIRLINE, INK, MUTED, PASS_COLOUR } from './plotStyle.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';

/** The yield at one value of the quantity that is swept. */
export interface SweepPoint extends Interval {
  readonly x: number;
  /** Share of good chips, with its interval low to high; all in [0, 1]. */
  readonly share: number;
  /** Mean of the judged figure, which a viewer shows at the point. */
  readonly mean?: number;
}

/** What may be chosen of a sweep's curve. */
export interface SweepCurveOptions extends CurveFigureOptions {
  /** Words below the axis: the quantity and its unit. */
  readonly label: string;
  /** What makes a chip good, such as `fidelity ≥ 0.99`. */
  readonly threshold: string;
  /** Confidence of the intervals, for the key; 0.95 by default. */
  readonly confidence?: number;
  /** Logarithmic axis. By default where all x are positive and span more than a decade. */
  readonly logX?: boolean;
  /** A value of the quantity that is marked by a line, with words over it. */
  readonly mark?: PlotMark;
  /** A curve to compare with: shares in [0, 1]. */
  readonly theory?: readonly { readonly x: number; readonly y: number }[];
}

const PADDING = 0.04;

/**
 * The yield against one quantity, with a band and whiskers for the intervals, as the text of an SVG document.
 * Points are drawn in the order of x, and numbered in it (`point-K`).
 * @throws RangeError for no points, numbers that are not finite, or a log axis with x <= 0; InputError
 *   `figure/width`
 */
export function drawSweepCurve(points: readonly SweepPoint[], options: SweepCurveOptions): string {
  requirePoints(points);
  const ordered = [...points].sort((one, other) => one.x - other.x);
  const least = ordered[0]!.x;
  const greatest = ordered[ordered.length - 1]!.x;
  const log = options.logX ?? (least > 0 && greatest > 10 * least * (1 + 1e-9));
  if (log && !(least > 0)) throw new RangeError('a logarithmic axis needs values larger than 0');
  const theory = (options.theory ?? []).filter(({ x }) => x >= least && x <= greatest);
  const what = `${options.threshold} at ${ordered.length} values of ${options.label}`;
  return drawPlot(
    {
      name: `Yield against ${options.label}`,
      description: `Share of chips with ${what}: ${ordered.map(pointText).join('; ')}.`,
      xLabel: options.label,
      yLabel: `yield: chips with ${options.threshold} (%)`,
      xAxis: (length) => sweepAxis(ordered, log, length, horizontalRoom),
      yAxis: (length) => linearAxis(0, 100, length, verticalRoom),
      key: keyOf(options, theory.length > 0),
      mark: options.mark,
      draw: (group, area) => {
        drawBand(group, area, ordered);
        drawTheory(group, area, theory);
        drawPoints(group, area, ordered);
      },
    },
    options,
  );
}

function requirePoints(points: readonly SweepPoint[]): void {
  if (points.length === 0) throw new RangeError('there are no points to draw');
  for (const { x, share, low, high } of points) {
    if (!(Number.isFinite(x) && low >= 0 && low <= share && share <= high && high <= 1)) {
      throw new RangeError(`not a yield with its interval: ${share} (${low} to ${high}) at ${x}`);
    }
  }
}

function sweepAxis(ordered: readonly SweepPoint[], log: boolean, length: number, room: LabelRoom): Axis {
  const least = ordered[0]!.x;
  const greatest = ordered[ordered.length - 1]!.x;
  if (log) {
    const factor = least === greatest ? 2 : (greatest / least) ** PADDING;
    return logAxis(least / factor, greatest * factor, length, room);
  }
  const range = least === greatest ? Math.abs(least) || 1 : greatest - least;
  const whole = least < greatest && ordered.every(({ x }) => Number.isInteger(x));
  return linearAxis(least - PADDING * range, greatest + PADDING * range, length, room, whole);
}

function keyOf({ confidence = 0.95 }: SweepCurveOptions, withTheory: boolean): KeyEntry[] {
  const text = `simulated, ${limitText(100 * confidence)} % interval`;
  const simulated: KeyEntry = { kind: 'dots', colour: PASS_COLOUR, band: BAND_COLOUR, text };
  return withTheory ? [simulated, { kind: 'dashes', colour: INK, text: 'theory' }] : [simulated];
}

function pointText(point: SweepPoint): string {
  const mean = point.mean === undefined ? '' : `, mean ${limitText(Number(point.mean.toPrecision(6)))}`;
  return `${quantityText(point.x, 6)}: ${shareWithInterval(point.share, point)}${mean}`;
}

function drawBand(group: SvgPart, { x, y }: PlotArea, ordered: readonly SweepPoint[]): void {
  if (ordered.length < 2) return;
  const band = areaShape<SweepPoint>()
    .x((point) => x(point.x))
    .y0(({ low }) => y(100 * low))
    .y1(({ high }) => y(100 * high))
    .digits(3);
  const line = lineShape<SweepPoint>()
    .x((point) => x(point.x))
    .y(({ share }) => y(100 * share))
    .digits(3);
  group.add('path', { id: 'band', d: band([...ordered]) ?? '', fill: BAND_COLOUR });
  group.add('path', {
    'id': 'curve',
    'd': line([...ordered]) ?? '',
    'fill': 'none',
    'stroke': PASS_COLOUR,
    'stroke-width': CURVE_WIDTH,
  });
}

function drawTheory(
  group: SvgPart,
  { x, y }: PlotArea,
  theory: readonly { readonly x: number; readonly y: number }[],
): void {
  if (theory.length === 0) return;
  const line = lineShape<{ readonly x: number; readonly y: number }>()
    .x((point) => x(point.x))
    .y((point) => y(100 * point.y))
    .digits(3);
  group.add('path', {
    'id': 'theory',
    'd': line([...theory]) ?? '',
    'fill': 'none',
    'stroke': INK,
    'stroke-width': CURVE_WIDTH,
    'stroke-dasharray': DASHES,
  });
}

function drawPoints(group: SvgPart, { x, y }: PlotArea, ordered: readonly SweepPoint[]): void {
  ordered.forEach((point, i) => {
    const part = group.add('g', { id: `point-${i + 1}` });
    part.addText('title', pointText(point));
    const [cx, low, high] = [x(point.x), y(100 * point.low), y(100 * point.high)].map(rounded) as [
      number,
      number,
      number,
    ];
    part.add('path', {
      'd': `M${cx} ${low}V${high}M${rounded(cx - 0.5)} ${low}h1M${rounded(cx - 0.5)} ${high}h1`,
      'fill': 'none',
      'stroke': MUTED,
      'stroke-width': HAIRLINE,
    });
    part.add('circle', { cx, cy: y(100 * point.share), r: 0.7, fill: PASS_COLOUR });
  });
}
