import { MARGIN, SMALL_TEXT } from './meshFigureLayout.js';
import { CURVE_WIDTH, HAIRLINE, INK } from './plotStyle.js';
import type { SvgPart } from './SvgPage.js';
import { guardedTextWidth, wrapText } from './textWidth.js';

/** One sign of a figure and what it means. */
export interface KeyEntry {
  readonly kind: 'box' | 'line' | 'dashes' | 'dots';
  readonly colour: string;
  /** Colour of a band behind a line. */
  readonly band?: string;
  readonly text: string;
}

const SIGN = 5;
const SIGN_GAP = 1;
const ENTRY_GAP = 4;
const LINE = 1.35 * SMALL_TEXT;

/** Draws the key in lines that fit the page, from `top` down, and returns its bottom. */
export function drawKey(page: SvgPart, entries: readonly KeyEntry[], width: number, top: number): number {
  if (entries.length === 0) return top;
  const group = page.add('g', { 'id': 'key', 'font-size': SMALL_TEXT });
  let x = MARGIN;
  let baseline = top + SMALL_TEXT;
  for (const entry of entries) {
    const textWidth = guardedTextWidth(entry.text, SMALL_TEXT);
    if (x > MARGIN && x + SIGN + SIGN_GAP + textWidth > width - MARGIN) {
      x = MARGIN;
      baseline += LINE;
    }
    drawSign(group, entry, x, baseline - 0.36 * SMALL_TEXT);
    const lines = wrapText(entry.text, width - MARGIN - x - SIGN - SIGN_GAP, SMALL_TEXT);
    lines.forEach((line, i) => {
      if (i > 0) baseline += LINE;
      group.addText('text', line, { x: x + SIGN + SIGN_GAP, y: baseline });
    });
    x += SIGN + SIGN_GAP + textWidth + ENTRY_GAP;
  }
  return baseline + 0.5 * SMALL_TEXT;
}

function drawSign(group: SvgPart, { kind, colour, band }: KeyEntry, x: number, y: number): void {
  if (band !== undefined) {
    group.add('rect', { x: x, y: y - 0.8, width: SIGN, height: 1.6, fill: band });
  }
  if (kind === 'box') {
    group.add('rect', {
      'x': x,
      'y': y - 0.8,
      'width': SIGN,
      'height': 1.6,
      'fill': colour,
      'stroke': INK,
      'stroke-width': HAIRLINE,
    });
    return;
  }
  group.add('path', {
    'd': `M${x} ${y}H${x + SIGN}`,
    'stroke': colour,
    'stroke-width': CURVE_WIDTH,
    ...(kind === 'dashes' ? { 'stroke-dasharray': DASHES } : {}),
  });
  if (kind === 'dots') group.add('circle', { cx: x + SIGN / 2, cy: y, r: 0.6, fill: colour });
}

/** Of lines that are not measured: theory, thresholds. */
export const DASHES = '1.2 0.8';
