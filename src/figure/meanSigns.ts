import { HAIRLINE, INK, MUTED } from './plotStyle.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';

/** A mean over trials; `standardError` null for a single trial, which has no whisker. */
export interface MeanEstimate {
  readonly mean: number;
  readonly standardError: number | null;
  /** Share of good chips in [0, 1], in brackets behind the mean. */
  readonly share?: number;
}

/** Diameter of a dot, height of a bar. */
export const BAR = 1.5;
const WHISKER = 0.9;

/** @throws RangeError for a mean or a standard error that is not finite */
export function requireMean({ mean, standardError }: MeanEstimate): void {
  const sound =
    Number.isFinite(mean) && (standardError === null || (standardError >= 0 && standardError < Infinity));
  if (!sound) throw new RangeError(`not a mean with its standard error: ${mean}, ${standardError}`);
}

/** A dot where a value stands, and a thin line that leads to it. */
export function drawDot(part: SvgPart, left: number, place: number, y: number, fill: string): void {
  part.add('path', {
    'd': `M${rounded(left)} ${rounded(y)}H${rounded(place)}`,
    'stroke': MUTED,
    'stroke-width': HAIRLINE,
  });
  part.add('circle', {
    'class': 'bar',
    'cx': place,
    'cy': y,
    'r': BAR / 2,
    fill,
    'stroke': INK,
    'stroke-width': HAIRLINE,
  });
}

/** The interval of a value. */
export function drawWhisker(part: SvgPart, from: number, to: number, y: number): void {
  const [low, high, top] = [from, to, y - WHISKER / 2].map(rounded);
  part.add('path', {
    'class': 'whisker',
    'd': `M${low} ${rounded(y)}H${high}M${low} ${top}v${WHISKER}M${high} ${top}v${WHISKER}`,
    'fill': 'none',
    'stroke': INK,
    'stroke-width': 0.2,
  });
}
