import { CAPTION_TEXT, drawLines, FONTS, TITLE_TEXT } from './drawMeshFigure.js';
import type { FigureWidth } from './meshFigureLayout.js';
import { askedWidth, MARGIN } from './meshFigureLayout.js';
import { printableText } from './printableText.js';
import type { SvgPart } from './SvgPage.js';
import { rounded, svgText } from './SvgPage.js';
import { wrapText } from './textWidth.js';

/** What every curve figure may carry. */
export interface CurveFigureOptions {
  readonly title?: string;
  /** Lines below the figure; each is wrapped to the width. */
  readonly captionLines?: readonly string[];
  /** Printed width: `one-column` 85 mm (the default), `two-column` 178 mm, or millimetres from 30 to 5000. */
  readonly width?: FigureWidth;
}

/** What a figure says to those who do not see it. */
export interface FigureDescription {
  /** Used where the figure has no title of its own. */
  readonly name: string;
  readonly description: string;
}

/**
 * A page like that of the mesh figure, title above and caption below, as the text of an SVG document; `draw`
 * fills what is between from `top` down and returns its bottom. Millimetres, and no text smaller than 6 pt.
 * The same arguments give the same bytes.
 * @throws InputError `figure/width` for a width outside 30 to 5000 mm
 */
export function figurePage(
  options: CurveFigureOptions,
  { name, description }: FigureDescription,
  draw: (page: SvgPart, width: number, top: number) => number,
): string {
  const width = askedWidth(options.width ?? 'one-column');
  const title = printableText(options.title ?? '');
  let height = 0;
  const body = (page: SvgPart): void => {
    page.addText('title', title === '' ? name : title);
    page.addText('desc', description);
    page.add('rect', { id: 'paper', width: '100%', height: '100%', fill: '#ffffff' });
    const titleLines = title === '' ? [] : wrapText(title, width - 2 * MARGIN, TITLE_TEXT, true);
    drawLines(page, 'title', titleLines, TITLE_TEXT, MARGIN + 0.8 * TITLE_TEXT, true);
    const top = MARGIN + titleLines.length * 1.2 * TITLE_TEXT;
    height = drawCaption(page, options.captionLines ?? [], width, draw(page, width, top)) + MARGIN;
  };
  return svgText(body, () => ({
    'role': 'img',
    'width': `${rounded(width)}mm`,
    'height': `${rounded(height)}mm`,
    'viewBox': `0 0 ${rounded(width)} ${rounded(height)}`,
    'font-family': FONTS,
    'fill': '#111111',
  }));
}

function drawCaption(page: SvgPart, captionLines: readonly string[], width: number, top: number): number {
  const lines = captionLines.flatMap((line) =>
    wrapText(printableText(line), width - 2 * MARGIN, CAPTION_TEXT),
  );
  const first = top + 0.6 + CAPTION_TEXT;
  drawLines(page, 'caption', lines, CAPTION_TEXT, first, false);
  return lines.length === 0 ? top : first + ((lines.length - 1) * 1.2 + 0.3) * CAPTION_TEXT;
}
