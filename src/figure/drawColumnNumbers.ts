import type { MeshFigureLayout } from './meshFigureLayout.js';
import { MARGIN, SMALL_TEXT } from './meshFigureLayout.js';
import type { MeshPen } from './MeshPen.js';
import type { SvgPart } from './SvgPage.js';
import { guardedTextWidth } from './textWidth.js';
import { thinnedNumbers } from './thinnedNumbers.js';

/** Words that may stand before the first column number, longest first. */
const COLUMN_WORDS = ['column', 'col.'] as const;

/** The word before the column numbers, or undefined where the left end has no room for any. */
export function columnWord(layout: MeshFigureLayout): string | undefined {
  const room = columnWordEnd(layout) - MARGIN;
  return COLUMN_WORDS.find((word) => guardedTextWidth(word, SMALL_TEXT) <= room);
}

function columnCentre(layout: MeshFigureLayout, number: number): number {
  return layout.firstColumn + (number - 0.5) * layout.columnWidth;
}

function columnWordEnd(layout: MeshFigureLayout): number {
  return columnCentre(layout, 1) - guardedTextWidth('1', SMALL_TEXT) / 2 - 0.7;
}

/** Column numbers below the mesh, with a word before the first one. */
export function drawColumnNumbers(page: SvgPart, { chip, layout }: MeshPen, baseline: number): void {
  const { columns } = chip.mesh;
  if (columns === 0) return;
  const group = page.add('g', { 'id': 'columns', 'font-size': SMALL_TEXT, 'fill': '#666666' });
  const word = columnWord(layout);
  if (word !== undefined) {
    group.addText('text', word, { 'x': columnWordEnd(layout), 'y': baseline, 'text-anchor': 'end' });
  }
  const distance = (guardedTextWidth(String(columns), SMALL_TEXT) + 0.5) / layout.columnWidth;
  for (const number of thinnedNumbers(columns, distance)) {
    group.addText('text', String(number), {
      'x': columnCentre(layout, number),
      'y': baseline,
      'text-anchor': 'middle',
    });
  }
}
