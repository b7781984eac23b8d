import { requireConfidence } from '../statistics/binomialInterval.js';
import { normalQuantile } from '../statistics/normalDistribution.js';
import type { CurveFigureOptions } from './figurePage.js';
import { figurePage } from './figurePage.js';
import type { MeanEstimate } from './meanSigns.js';
import { BAR, drawDot, drawWhisker, requireMean } from './meanSigns.js';
import { HALF_DIGIT, MARGIN, SMALL_TEXT } from './meshFigureLayout.js';
import { limitText, quantityText, shareText } from './numberText.js';
import type { Axis } from './plotAxis.js';
import { logAxis } from './plotAxis.js';
import type { PlotArea } from './plotFrame.js';
import { drawXAxis, horizontalRoom } from './plotFrame.js';
import { GRID, HAIRLINE, INK, PASS_COLOUR } from './plotStyle.js';
import { printableText } from './printableText.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';
import { cutText, guardedTextWidth, wrapText } from './textWidth.js';

/** One way to set up a chip, and how well it does. */
export interface ComparisonRow {
  readonly label: string;
  /** Mean of an error, such as 1 - fidelity; those at or below {@link NO_ERROR} are rounding. */
  readonly error: MeanEstimate;
  /** Chips that are good, and all. */
  readonly passed: number;
  readonly trials: number;
}

/** Rows that share a chip. */
export interface ComparisonGroup {
  readonly label: string;
  /** What such a chip takes, in words, behind the label. */
  readonly facts?: string;
  readonly rows: readonly ComparisonRow[];
}

/** What may be chosen of a comparison's figure. */
export interface ComparisonOptions extends CurveFigureOptions {
  /** Words below the axis; `mean infidelity 1 − F` by default. */
  readonly label?: string;
  /** Words over the shares of good chips; `yield` by default. */
  readonly shareLabel?: string;
  /** Confidence of the whiskers; 0.95 by default. */
  readonly confidence?: number;
  /** Small print below the axis. */
  readonly notes?: readonly string[];
}

/** Means at or below this are rounding: they have no place on a logarithmic axis. */
export const NO_ERROR = 1e-12;

const PITCH = 1.35 * SMALL_TEXT;
const HEADING_LINE = 1.2 * SMALL_TEXT;
const GROUP_GAP = 1.2;
const GAP = 1;
/** From the end of a whisker or the edge of a dot. */
const VALUE_GAP = 0.8;
const LABEL_SHARE = 0.3;
/** With less room for the axis the means are not written beside their dots. */
const LEAST_AXIS = 22;
/** An axis for figures without any error. */
const EMPTY_AXIS = [1e-3, 1] as const;

/**
 * How well chips do in several layouts, with several kinds of cells and ways to set them, as the text of an
 * SVG document: a row each with the mean error on a logarithmic axis, its interval, and the share of good
 * chips. Rows stand in the order given.
 * @throws RangeError for no rows, means that are not finite, or a confidence outside (0, 1); InputError
 * `figure/width`
 */
export function drawComparison(groups: readonly ComparisonGroup[], options: ComparisonOptions = {}): string {
  const { label = 'mean infidelity 1 − F', shareLabel = 'yield', confidence = 0.95, notes = [] } = options;
  requireConfidence(confidence);
  const rows = groups.flatMap((group) => group.rows);
  if (rows.length === 0) throw new RangeError('there is nothing to compare');
  for (const { error } of rows) requireMean(error);
  const reach = -normalQuantile((1 - confidence) / 2);
  const description = `${label} and ${shareLabel}: ${groups.map(groupText).join('; ')}.`;
  const allNotes = [`Whiskers: ${limitText(100 * confidence)} % interval of the mean.`, ...notes];
  return figurePage(options, { name: `Comparison: ${label}`, description }, (page, width, top) => {
    const frame = comparisonFrame(groups, shareLabel, reach, width, top);
    drawGrid(page, frame);
    const head = page.add('g', { 'id': 'share-label', 'font-size': SMALL_TEXT, 'text-anchor': 'end' });
    head.addText('text', frame.shareLabel, { x: width - MARGIN, y: top + 0.85 * SMALL_TEXT });
    const data = page.add('g', { 'id': 'data', 'font-size': SMALL_TEXT });
    let count = 0;
    for (const group of frame.groups) {
      drawHeading(data, group);
      group.rows.forEach((row, k) =>
        drawRow(data, frame, row, ++count, group.top + (k + 0.5) * PITCH, reach, width),
      );
    }
    return drawXAxis(page, frame.area, frame.axis, label, allNotes, width);
  });
}

function groupText({ label, facts, rows }: ComparisonGroup): string {
  const words = rows.map((row) => `${row.label} ${errorText(row)}, ${shareText(row.passed, row.trials)}`);
  return `${label}${facts === undefined ? '' : ` (${facts})`}: ${words.join(', ')}`;
}

function errorText({ error: { mean } }: ComparisonRow): string {
  return mean > NO_ERROR ? quantityText(mean) : `< ${quantityText(NO_ERROR)}`;
}

interface PlacedGroup extends ComparisonGroup {
  readonly headingLines: readonly string[];
  readonly headingTop: number;
  /** Top of the first row. */
  readonly top: number;
}

interface ComparisonFrame {
  readonly groups: readonly PlacedGroup[];
  readonly area: PlotArea;
  readonly axis: Axis;
  readonly labelRoom: number;
  readonly shareLabel: string;
  readonly writesMeans: boolean;
}

function comparisonFrame(
  groups: readonly ComparisonGroup[],
  shareWords: string,
  reach: number,
  width: number,
  top: number,
): ComparisonFrame {
  const rows = groups.flatMap((group) => group.rows);
  const widest = (texts: readonly string[]): number =>
    Math.max(...texts.map((text) => guardedTextWidth(text, SMALL_TEXT)));
  const labelRoom = Math.min(LABEL_SHARE * width, widest(rows.map((row) => printableText(row.label))));
  const shareRoom = widest(rows.map((row) => shareText(row.passed, row.trials)));
  const left = MARGIN + labelRoom + GAP;
  const end = width - MARGIN - shareRoom - GAP;
  const withMeans = end - widest(rows.map(errorText)) - VALUE_GAP - BAR / 2;
  const writesMeans = withMeans - left >= LEAST_AXIS;
  const right = writesMeans ? withMeans : end - BAR / 2;
  const axis = errorAxis(rows, reach, right - left);
  const shareLabel = cutText(printableText(shareWords), width - 2 * MARGIN, SMALL_TEXT);
  let bottom = top + HEADING_LINE;
  const placed = groups.map((group, k): PlacedGroup => {
    const headingLines = linesOfHeading(group, width - 2 * MARGIN);
    const headingTop = bottom + (k === 0 ? 0 : GROUP_GAP);
    const first = headingTop + headingLines.length * HEADING_LINE + 0.3;
    bottom = first + group.rows.length * PITCH;
    return { ...group, headingLines, headingTop, top: first };
  });
  const x = (value: number): number => left + axis.position(value);
  const area = { left, right, top, bottom, x, y: (value: number) => value };
  return { groups: placed, area, axis, labelRoom, shareLabel, writesMeans };
}

/** Label and facts in one line, or else each in lines of its own. */
function linesOfHeading({ label, facts }: ComparisonGroup, room: number): string[] {
  const lines = (text: string): string[] => wrapText(printableText(text), room, SMALL_TEXT);
  if (facts === undefined) return lines(label);
  const whole = lines(`${label}: ${facts}`);
  return whole.length === 1 ? whole : [...lines(label), ...lines(facts)];
}

function errorAxis(rows: readonly ComparisonRow[], reach: number, length: number): Axis {
  const shown = rows.map(({ error }) => error).filter(({ mean }) => mean > NO_ERROR);
  if (shown.length === 0) return logAxis(...EMPTY_AXIS, length, horizontalRoom);
  const lowest = Math.min(...shown.map(({ mean }) => mean)) / 2;
  const highest = Math.max(...shown.map(({ mean, standardError }) => mean + reach * (standardError ?? 0)));
  return logAxis(lowest, 1.2 * highest, length, horizontalRoom);
}

/** Lines at the axis' numbers, through the rows of every group and not through its heading. */
function drawGrid(page: SvgPart, { groups, area, axis }: ComparisonFrame): void {
  const lines = groups.flatMap(({ top, rows }) =>
    axis.ticks.map(
      ({ value }) => `M${rounded(area.x(value))} ${rounded(top)}v${rounded(rows.length * PITCH)}`,
    ),
  );
  page.add('path', { 'id': 'grid', 'd': lines.join(''), 'stroke': GRID, 'stroke-width': HAIRLINE });
}

function drawHeading(data: SvgPart, { headingLines, headingTop }: PlacedGroup): void {
  headingLines.forEach((line, k) =>
    data.addText('text', line, {
      'x': MARGIN,
      'y': headingTop + (k + 0.85) * HEADING_LINE,
      'font-style': 'italic',
    }),
  );
}

function drawRow(
  data: SvgPart,
  { area, axis, labelRoom, writesMeans }: ComparisonFrame,
  row: ComparisonRow,
  count: number,
  y: number,
  reach: number,
  width: number,
): void {
  const { mean, standardError } = row.error;
  const share = shareText(row.passed, row.trials);
  const part = data.add('g', { id: `row-${count}` });
  part.addText('title', `${row.label}: ${errorText(row)}, ${share}`);
  const baseline = y + HALF_DIGIT;
  const label = cutText(printableText(row.label), labelRoom, SMALL_TEXT);
  part.addText('text', label, { 'x': area.left - GAP, 'y': baseline, 'text-anchor': 'end' });
  part.addText('text', share, { 'x': width - MARGIN, 'y': baseline, 'text-anchor': 'end' });
  let end = area.left;
  if (mean > NO_ERROR) {
    const half = reach * (standardError ?? 0);
    const place = area.x(mean);
    drawDot(part, area.left, place, y, PASS_COLOUR);
    if (half > 0) drawWhisker(part, area.x(Math.max(axis.low, mean - half)), area.x(mean + half), y);
    end = Math.max(place + BAR / 2, area.x(mean + half));
  }
  // Where there is no dot, the words may have the room of the axis.
  const text = errorText(row);
  const fits = mean <= NO_ERROR && guardedTextWidth(text, SMALL_TEXT) + VALUE_GAP <= area.right - area.left;
  if (!writesMeans && !fits) return;
  part.addText('text', text, { x: end + VALUE_GAP, y: baseline, fill: INK });
}
