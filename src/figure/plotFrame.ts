import type { CurveFigureOptions, FigureDescription } from './figurePage.js';
import { figurePage } from './figurePage.js';
import { CAPTION_TEXT } from './drawMeshFigure.js';
import { HALF_DIGIT, MARGIN, SMALL_TEXT } from './meshFigureLayout.js';
import type { Axis } from './plotAxis.js';
import type { KeyEntry } from './plotKey.js';
import { DASHES, drawKey } from './plotKey.js';
import { GRID, HAIRLINE, INK } from './plotStyle.js';
import { printableText } from './printableText.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';
import { guardedTextWidth, wrapText } from './textWidth.js';

/** The rectangle inside the axes, in millimetres of the page. */
export interface PlotArea {
  readonly left: number;
  readonly right: number;
  readonly top: number;
  readonly bottom: number;
  /** Where values of the two axes stand on the page. */
  readonly x: (value: number) => number;
  readonly y: (value: number) => number;
}

/** A vertical line with words above it; where the axis does not reach it, the words alone, with an arrow. */
export interface PlotMark {
  readonly value: number;
  readonly text: string;
}

export interface Plot extends FigureDescription {
  readonly xLabel: string;
  readonly yLabel: string;
  readonly xAxis: (length: number) => Axis;
  readonly yAxis: (length: number) => Axis;
  readonly key?: readonly KeyEntry[];
  readonly mark?: PlotMark | undefined;
  /** Small print below the axis. */
  readonly notes?: readonly string[];
  readonly draw: (group: SvgPart, area: PlotArea) => void;
}

const TICK = 0.9;
const TICK_GAP = 0.5;
/** Beyond the last tick's middle. */
const RIGHT_ROOM = 2.5;
const MOST_ATTEMPTS = 4;
const LEAST_HEIGHT = 28;
const MOST_HEIGHT = 80;
const SMALL_LINE = 1.2 * SMALL_TEXT;
const LABEL_LINE = 1.2 * CAPTION_TEXT;

/** A plot with two axes, as the text of an SVG document. @throws InputError for a width out of range */
export function drawPlot(plot: Plot, options: CurveFigureOptions): string {
  return figurePage(options, plot, (page, width, top) => {
    const keyBottom = drawKey(page, plot.key ?? [], width, top);
    const height = Math.min(MOST_HEIGHT, Math.max(LEAST_HEIGHT, 0.52 * width));
    const yAxis = plot.yAxis(height);
    const {
      left,
      right,
      axis: xAxis,
    } = placeXAxis(plot, MARGIN + widestTick(yAxis) + TICK + TICK_GAP, width - MARGIN - RIGHT_ROOM, width);
    const head = headOf(plot, xAxis, left, width);
    const areaTop = keyBottom + head.height;
    const area: PlotArea = {
      left,
      right,
      top: areaTop,
      bottom: areaTop + height,
      x: (value) => left + xAxis.position(value),
      y: (value) => areaTop + height - yAxis.position(value),
    };
    drawGrid(page, area, yAxis);
    plot.draw(page.add('g', { id: 'data' }), area);
    drawHead(page, plot, head, area, keyBottom);
    drawYTicks(page, area, yAxis);
    return drawXAxis(page, area, xAxis, plot.xLabel, plot.notes ?? [], width);
  });
}

/** The axis as long as its outermost numbers leave it on the page. */
function placeXAxis(
  plot: Plot,
  leftmost: number,
  rightmost: number,
  width: number,
): { left: number; right: number; axis: Axis } {
  let [left, right] = [leftmost, rightmost];
  for (let attempt = 0; ; attempt++) {
    const axis = plot.xAxis(right - left);
    let [beyondLeft, beyondRight] = [0, 0];
    for (const { value, text } of axis.ticks) {
      const half = guardedTextWidth(text, SMALL_TEXT) / 2;
      beyondLeft = Math.max(beyondLeft, MARGIN + half - (left + axis.position(value)));
      beyondRight = Math.max(beyondRight, left + axis.position(value) + half - (width - MARGIN));
    }
    // Other ticks may come with another length, but hardly more than once.
    if (attempt === MOST_ATTEMPTS || !(beyondLeft > 0 || beyondRight > 0)) return { left, right, axis };
    left += beyondLeft;
    right -= beyondRight;
  }
}

function widestTick(axis: Axis): number {
  return Math.max(...axis.ticks.map(({ text }) => guardedTextWidth(text, SMALL_TEXT)), 1);
}

/** What stands above the area: the vertical axis' words at the left, the mark's words over its line. */
interface Head {
  readonly labelLines: readonly string[];
  readonly markLines: readonly string[];
  /** Middle of the mark's words, and x of its line, null where the axis does not reach it. */
  readonly markMiddle: number;
  readonly markX: number | null;
  readonly shared: boolean;
  readonly height: number;
}

function headOf({ yLabel, mark }: Plot, xAxis: Axis, left: number, width: number): Head {
  const room = width - 2 * MARGIN;
  const labelLines = wrapText(printableText(yLabel), room, CAPTION_TEXT);
  const reached = mark !== undefined && mark.value >= xAxis.low && mark.value <= xAxis.high;
  const markLines = mark === undefined ? [] : wrapText(markText(mark, xAxis, reached), room, SMALL_TEXT);
  const half = Math.max(0, ...markLines.map((line) => guardedTextWidth(line, SMALL_TEXT))) / 2;
  const wished = mark === undefined ? 0 : left + xAxis.position(mark.value);
  const markMiddle = Math.max(MARGIN + half, Math.min(width - MARGIN - half, wished));
  const labelWidth = guardedTextWidth(labelLines[0] ?? '', CAPTION_TEXT);
  const shared =
    labelLines.length === 1 && markLines.length === 1 && MARGIN + labelWidth + 2 <= markMiddle - half;
  const markHeight = shared ? 0 : markLines.length * SMALL_LINE;
  const height = labelLines.length * LABEL_LINE + markHeight + 0.6 * SMALL_TEXT;
  return { labelLines, markLines, markMiddle, markX: reached ? wished : null, shared, height };
}

function markText({ value, text }: PlotMark, { low }: Axis, reached: boolean): string {
  const words = printableText(text);
  if (reached) return words;
  return value < low ? `← ${words}` : `${words} →`;
}

function drawHead(page: SvgPart, { mark }: Plot, head: Head, area: PlotArea, top: number): void {
  const group = page.add('g', { 'id': 'vertical-label', 'font-size': CAPTION_TEXT });
  head.labelLines.forEach((line, i) =>
    group.addText('text', line, { x: MARGIN, y: top + 0.85 * CAPTION_TEXT + i * LABEL_LINE }),
  );
  if (mark === undefined) return;
  const marks = page.add('g', { 'id': 'mark', 'font-size': SMALL_TEXT, 'text-anchor': 'middle' });
  const lastBaseline = area.top - 0.8 * SMALL_TEXT;
  const firstBaseline = lastBaseline - (head.markLines.length - 1) * SMALL_LINE;
  head.markLines.forEach((line, i) =>
    marks.addText('text', line, { x: head.markMiddle, y: firstBaseline + i * SMALL_LINE }),
  );
  if (head.markX === null) return;
  marks.add('path', {
    'id': 'mark-line',
    'd': `M${rounded(head.markX)} ${rounded(area.top - 0.5 * SMALL_TEXT)}V${rounded(area.bottom)}`,
    'stroke': INK,
    'stroke-width': 0.2,
    'stroke-dasharray': DASHES,
  });
}

function drawGrid(page: SvgPart, area: PlotArea, yAxis: Axis): void {
  const lines = yAxis.ticks.map(
    ({ value }) => `M${rounded(area.left)} ${rounded(area.y(value))}H${rounded(area.right)}`,
  );
  page.add('path', { 'id': 'grid', 'd': lines.join(''), 'stroke': GRID, 'stroke-width': HAIRLINE });
}

function drawYTicks(page: SvgPart, area: PlotArea, yAxis: Axis): void {
  const marks = yAxis.ticks.map(
    ({ value }) => `M${rounded(area.left - TICK)} ${rounded(area.y(value))}H${rounded(area.left)}`,
  );
  const line = `M${rounded(area.left)} ${rounded(area.top)}V${rounded(area.bottom)}`;
  page.add('path', {
    'id': 'vertical-axis',
    'd': line + marks.join(''),
    'fill': 'none',
    'stroke': INK,
    'stroke-width': 0.2,
  });
  const group = page.add('g', { 'id': 'vertical-ticks', 'font-size': SMALL_TEXT, 'text-anchor': 'end' });
  for (const { value, text } of yAxis.ticks) {
    group.addText('text', text, { x: area.left - TICK - TICK_GAP, y: area.y(value) + HALF_DIGIT });
  }
}

/** The horizontal axis below the area with its numbers, words and notes; returns the bottom. */
export function drawXAxis(
  page: SvgPart,
  area: PlotArea,
  axis: Axis,
  label: string,
  notes: readonly string[],
  width: number,
): number {
  const mark = (value: number, length: number): string =>
    `M${rounded(area.x(value))} ${rounded(area.bottom)}v${rounded(length)}`;
  const marks = [
    ...axis.ticks.map(({ value }) => mark(value, TICK)),
    ...axis.minor.map((value) => mark(value, TICK / 2)),
  ];
  page.add('path', {
    'id': 'horizontal-axis',
    'd': `M${rounded(area.left)} ${rounded(area.bottom)}H${rounded(area.right)}${marks.join('')}`,
    'fill': 'none',
    'stroke': INK,
    'stroke-width': 0.2,
  });
  const ticks = page.add('g', { 'id': 'horizontal-ticks', 'font-size': SMALL_TEXT, 'text-anchor': 'middle' });
  const tickBaseline = area.bottom + TICK + TICK_GAP + 0.78 * SMALL_TEXT;
  for (const { value, text } of axis.ticks) {
    const half = guardedTextWidth(text, SMALL_TEXT) / 2;
    const x = Math.max(MARGIN + half, Math.min(width - MARGIN - half, area.x(value)));
    ticks.addText('text', text, { x, y: tickBaseline });
  }
  const labelBottom = drawXLabel(page, area, label, width, tickBaseline + 0.35 * SMALL_TEXT);
  return drawNotes(page, notes, width, labelBottom);
}

function drawXLabel(page: SvgPart, area: PlotArea, label: string, width: number, top: number): number {
  const lines = wrapText(printableText(label), width - 2 * MARGIN, CAPTION_TEXT);
  const half = Math.max(0, ...lines.map((line) => guardedTextWidth(line, CAPTION_TEXT))) / 2;
  const wished = (area.left + area.right) / 2;
  const x = Math.max(MARGIN + half, Math.min(width - MARGIN - half, wished));
  const group = page.add('g', {
    'id': 'horizontal-label',
    'font-size': CAPTION_TEXT,
    'text-anchor': 'middle',
  });
  lines.forEach((line, i) => group.addText('text', line, { x, y: top + (0.9 + 1.2 * i) * CAPTION_TEXT }));
  return top + (1.2 * lines.length + 0.05) * CAPTION_TEXT;
}

function drawNotes(page: SvgPart, notes: readonly string[], width: number, top: number): number {
  if (notes.length === 0) return top;
  const lines = wrapText(printableText(notes.join(' ')), width - 2 * MARGIN, SMALL_TEXT);
  const group = page.add('g', { 'id': 'notes', 'font-size': SMALL_TEXT, 'fill': '#444444' });
  lines.forEach((line, i) =>
    group.addText('text', line, { x: MARGIN, y: top + SMALL_TEXT + 0.3 + i * SMALL_LINE }),
  );
  return top + 0.3 + SMALL_TEXT + (lines.length - 1) * SMALL_LINE + 0.25 * SMALL_TEXT;
}

/** Room of a label along the horizontal axis. */
export function horizontalRoom(text: string): number {
  // Superscripts are the least certain of all widths.
  return guardedTextWidth(text, SMALL_TEXT) + 2;
}

/** Room of a label along the vertical axis. */
export function verticalRoom(): number {
  return 3 * SMALL_TEXT;
}
