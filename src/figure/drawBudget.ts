import { requireConfidence } from '../statistics/binomialInterval.js';
import { normalQuantile } from '../statistics/normalDistribution.js';
import type { CurveFigureOptions } from './figurePage.js';
import { figurePage } from './figurePage.js';
import { HALF_DIGIT, MARGIN, SMALL_TEXT } from './meshFigureLayout.js';
import { limitText, quantityText } from './numberText.js';
import type { Axis } from './plotAxis.js';
import { linearAxis, logAxis } from './plotAxis.js';
import type { PlotArea } from './plotFrame.js';
import { drawXAxis, horizontalRoom } from './plotFrame.js';
import type { KeyEntry } from './plotKey.js';
import { drawKey } from './plotKey.js';
import type { MeanEstimate } from './meanSigns.js';
import { BAR, drawDot, drawWhisker, requireMean } from './meanSigns.js';
import { FAIL_COLOUR, HAIRLINE, INK, PASS_COLOUR } from './plotStyle.js';
import { printableText } from './printableText.js';
import type { SvgPart } from './SvgPage.js';
import { cutText, guardedTextWidth, wrapText } from './textWidth.js';

/** What one source of error costs. */
export interface BudgetRow {
  readonly source: string;
  /** With this source alone; absent for a correlation, which is nothing alone. */
  readonly alone?: MeanEstimate;
  /** With all sources but this one, or without this correlation. */
  readonly without: MeanEstimate;
}

/** What may be chosen of a budget's figure. */
export interface BudgetOptions extends CurveFigureOptions {
  /** Words below the axis; `mean infidelity 1 − F` by default. */
  readonly label?: string;
  /** Confidence of the whiskers; 0.95 by default. */
  readonly confidence?: number;
  /** Logarithmic axis. By default where the positive means span more than a factor of 30. */
  readonly log?: boolean;
}

const BAR_PITCH = 1.25 * SMALL_TEXT;
const ROW_GAP = 1.5;
const LABEL_GAP = 1;
/** From the end of a whisker or the edge of a dot. */
const VALUE_GAP = 0.8;
const LABEL_SHARE = 0.36;
const MOST_LABEL_LINES = 2;
const LOG_FROM_RATIO = 30;
const TOGETHER = 'all sources together';
const SHARES_NOTE = 'In brackets: share of good chips.';

/** One bar: what is drawn in a row of the figure. */
interface Bar {
  readonly id: string;
  /** Words between the label and the value, for those who do not see the figure. */
  readonly what: string;
  readonly estimate: MeanEstimate;
  readonly colour: string;
}

interface Block {
  readonly label: string;
  readonly bars: readonly Bar[];
}

/**
 * What each source of error costs, alone and in company, as the text of an SVG document: first all sources
 * together, then the sources by what they cost alone, the most expensive on top; each with a second bar for
 * all sources but this one. On a linear axis bars start at 0; a logarithmic axis has no 0, so there a dot
 * marks the value and only a thin line leads to it.
 * @param rows in any order
 * @param together with all sources
 * @throws RangeError for no rows, means that are not finite, or a confidence outside (0, 1); InputError
 *   `figure/width`
 */
export function drawBudget(
  rows: readonly BudgetRow[],
  together: MeanEstimate,
  options: BudgetOptions = {},
): string {
  const { label = 'mean infidelity 1 − F', confidence = 0.95 } = options;
  requireConfidence(confidence);
  requireRows(rows, together);
  const reach = -normalQuantile((1 - confidence) / 2);
  const blocks = blocksOf(rows, together);
  const description = `${label} by source of error: ${blocks.map(blockText).join('; ')}.`;
  const notes = [
    `Whiskers: ${limitText(100 * confidence)} % interval of the mean.`,
    ...(together.share === undefined ? [] : [SHARES_NOTE]),
  ];
  return figurePage(options, { name: `Error budget: ${label}`, description }, (page, width, top) => {
    const areaTop = drawKey(page, keyOf(rows), width, top) + 0.8;
    const frame = budgetFrame(blocks, options, reach, width, areaTop);
    const data = page.add('g', { 'id': 'data', 'font-size': SMALL_TEXT });
    drawBlocks(data, frame, reach);
    return drawXAxis(page, frame.area, frame.axis, label, notes, width);
  });
}

function requireRows(rows: readonly BudgetRow[], together: MeanEstimate): void {
  if (rows.length === 0) throw new RangeError('there are no sources of error to draw');
  const estimates = rows.flatMap(({ alone, without }) =>
    alone === undefined ? [without] : [alone, without],
  );
  for (const estimate of [together, ...estimates]) requireMean(estimate);
}

function blocksOf(rows: readonly BudgetRow[], together: MeanEstimate): Block[] {
  const bar = (id: string, what: string, estimate: MeanEstimate, colour: string): Bar => ({
    id,
    what,
    estimate,
    colour,
  });
  const cost = ({ alone }: BudgetRow): number => alone?.mean ?? -Infinity;
  const ranked = [...rows].sort((one, other) => (cost(one) === cost(other) ? 0 : cost(other) - cost(one)));
  return [
    { label: TOGETHER, bars: [bar('together', '', together, INK)] },
    ...ranked.map(({ source, alone, without }, i) => ({
      label: printableText(source),
      bars:
        alone === undefined
          ? [bar(`without-${i + 1}`, ' left out', without, FAIL_COLOUR)]
          : [
              bar(`alone-${i + 1}`, ' alone', alone, PASS_COLOUR),
              bar(`without-${i + 1}`, ' all but this one', without, FAIL_COLOUR),
            ],
    })),
  ];
}

function blockText({ label, bars }: Block): string {
  return `${label}${bars.map(({ what, estimate }) => `${what} ${valueText(estimate)}`).join(',')}`;
}

function valueText({ mean, share }: MeanEstimate): string {
  return share === undefined ? quantityText(mean) : `${quantityText(mean)} (${quantityText(100 * share)} %)`;
}

function keyOf(rows: readonly BudgetRow[]): KeyEntry[] {
  const correlated = rows.some(({ alone }) => alone === undefined);
  const others = correlated ? 'all but this one' : 'all sources but this one';
  return [
    { kind: 'box', colour: PASS_COLOUR, text: 'this source alone' },
    { kind: 'box', colour: FAIL_COLOUR, text: others },
  ];
}

interface PlacedBlock extends Block {
  readonly labelLines: readonly string[];
  readonly top: number;
  readonly height: number;
}

interface BudgetFrame {
  readonly blocks: readonly PlacedBlock[];
  readonly area: PlotArea;
  readonly axis: Axis;
  readonly log: boolean;
}

function budgetFrame(
  blocks: readonly Block[],
  options: BudgetOptions,
  reach: number,
  width: number,
  top: number,
): BudgetFrame {
  const labelRoom = LABEL_SHARE * width;
  const lines = blocks.map(({ label }) => labelLines(label, labelRoom));
  const widestLabel = Math.max(...lines.flat().map((line) => guardedTextWidth(line, SMALL_TEXT)));
  const bars = blocks.flatMap((block) => block.bars);
  const widestValue = Math.max(...bars.map(({ estimate }) => valueWidth(estimate)));
  const left = MARGIN + widestLabel + LABEL_GAP;
  const log = options.log ?? spansDecades(bars);
  const right = width - MARGIN - widestValue - BAR / 2 - VALUE_GAP;
  const axis = budgetAxis(bars, log, reach, right - left);
  let bottom = top;
  const placed = blocks.map((block, i) => {
    const height = Math.max(block.bars.length, lines[i]!.length) * BAR_PITCH;
    const place = { ...block, labelLines: lines[i]!, top: bottom, height };
    bottom += height + ROW_GAP;
    return place;
  });
  const x = (value: number): number => left + axis.position(value);
  return { blocks: placed, area: { left, right, top, bottom, x, y: (value) => value }, axis, log };
}

function labelLines(label: string, room: number): string[] {
  const lines = wrapText(label, room, SMALL_TEXT);
  if (lines.length <= MOST_LABEL_LINES) return lines;
  const rest = lines.slice(MOST_LABEL_LINES - 1).join(' ');
  return [...lines.slice(0, MOST_LABEL_LINES - 1), cutText(rest, room, SMALL_TEXT)];
}

function valueWidth(estimate: MeanEstimate): number {
  return guardedTextWidth(valueText(estimate), SMALL_TEXT) + 0.6;
}

function spansDecades(bars: readonly Bar[]): boolean {
  const positive = bars.map(({ estimate }) => estimate.mean).filter((mean) => mean > 0);
  return positive.length > 1 && Math.max(...positive) > LOG_FROM_RATIO * Math.min(...positive);
}

function budgetAxis(bars: readonly Bar[], log: boolean, reach: number, length: number): Axis {
  const ends = bars.map(({ estimate }) => estimate.mean + reach * (estimate.standardError ?? 0));
  const highest = Math.max(...ends);
  if (!log) {
    const lowest = Math.min(0, ...bars.map(({ estimate }) => estimate.mean));
    return linearAxis(lowest, highest > lowest ? highest : lowest + 1, length, horizontalRoom);
  }
  const positive = bars.map(({ estimate }) => estimate.mean).filter((mean) => mean > 0);
  if (positive.length === 0) throw new RangeError('a logarithmic axis needs a mean larger than 0');
  return logAxis(Math.min(...positive) / 2, highest, length, horizontalRoom);
}

function drawBlocks(group: SvgPart, { blocks, area, log }: BudgetFrame, reach: number): void {
  blocks.forEach(({ label, labelLines: lines, bars, top, height }, i) => {
    const row = group.add('g', { id: `row-${i}` });
    row.addText('title', blockText({ label, bars }));
    const firstLine = top + (height - lines.length * BAR_PITCH) / 2;
    lines.forEach((line, k) =>
      row.addText('text', line, {
        'x': area.left - LABEL_GAP,
        'y': firstLine + (k + 0.5) * BAR_PITCH + HALF_DIGIT,
        'text-anchor': 'end',
        ...(i === 0 ? { 'font-style': 'italic' } : {}),
      }),
    );
    const firstBar = top + (height - bars.length * BAR_PITCH) / 2;
    bars.forEach((bar, k) => drawBar(row, area, bar, firstBar + (k + 0.5) * BAR_PITCH, log, reach));
  });
}

function drawBar(row: SvgPart, area: PlotArea, bar: Bar, y: number, log: boolean, reach: number): void {
  const { mean, standardError } = bar.estimate;
  const half = reach * (standardError ?? 0);
  const part = row.add('g', { id: bar.id });
  if (!log) drawSolidBar(part, area.x(0), area.x(mean), y, bar.colour);
  else if (mean > 0) drawDot(part, area.left, area.x(mean), y, bar.colour);
  if (half > 0 && (mean > 0 || !log)) drawWhisker(part, area.x(mean - half), area.x(mean + half), y);
  const dot = log ? BAR / 2 : 0;
  const start = log ? area.left : area.x(0);
  const end = mean > 0 || !log ? Math.max(start, area.x(mean) + dot, area.x(mean + half)) : start;
  part.addText('text', valueText(bar.estimate), { x: end + VALUE_GAP, y: y + HALF_DIGIT });
}

function drawSolidBar(part: SvgPart, zero: number, end: number, y: number, fill: string): void {
  part.add('rect', {
    'class': 'bar',
    'x': Math.min(zero, end),
    'y': y - BAR / 2,
    'width': Math.abs(end - zero),
    'height': BAR,
    fill,
    'stroke': INK,
    'stroke-width': HAIRLINE,
  });
}
