import type { Chip } from '../chip/Chip.js';
import type { MeshFigureLayout } from './meshFigureLayout.js';
import { MARGIN, SMALL_TEXT } from './meshFigureLayout.js';
import type { MeshPen } from './MeshPen.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';
import { guardedTextWidth } from './textWidth.js';

/**
 * Classes of the margin between the bar power wanted of a cell and the nearer end of what it can do, from the
 * worst on: below `below`. Their greys fall as their colours do, so that they can be told apart in grey print.
 */
const CLASSES = [
  { below: 0, colour: '#cf8bc0', label: 'out of reach' },
  { below: 0.001, colour: '#e3b9da', label: 'under 0.001' },
  { below: 0.01, colour: '#f4e2f0', label: 'under 0.01' },
  { below: Infinity, colour: '#ffffff', label: '0.01 or more' },
] as const;

/** Rounding of a bar power at the end of the reach is not a miss. */
const ROUNDING = 1e-12;

const SWATCH = 2.4;
const GAP = 1;
const LABEL = 'Margin of bar power:';

function classOf(margin: number): (typeof CLASSES)[number] {
  return CLASSES.find(({ below }) => margin + ROUNDING < below) ?? CLASSES[CLASSES.length - 1]!;
}

/** Shades the area of every cell by its margin; to be drawn below the guides. */
export function drawReach(
  page: SvgPart,
  { chip, layout, guideY }: MeshPen,
  margins: readonly number[],
): void {
  const group = page.add('g', { id: 'reach' });
  for (const shade of CLASSES) {
    if (shade.below === Infinity) continue;
    const areas = margins.map((margin, cell) =>
      classOf(margin) === shade ? areaOf(chip, layout, guideY, cell) : '',
    );
    const path = areas.join('');
    if (path !== '') group.add('path', { d: path, fill: shade.colour });
  }
}

/** The area of a cell, within those of its neighbours, as path data. */
function areaOf(
  { mesh }: Chip,
  layout: MeshFigureLayout,
  guideY: (port: number) => number,
  cell: number,
): string {
  const inset = 0.04 * layout.columnWidth;
  const x = rounded(layout.firstColumn + mesh.columnIndex[cell]! * layout.columnWidth + inset);
  const y = rounded(guideY(mesh.upperPortIndex[cell]!) - 0.42 * layout.pitch);
  const width = rounded(layout.columnWidth - 2 * inset);
  const height = rounded(1.84 * layout.pitch);
  return `M${x} ${y}h${width}v${height}h${-width}z`;
}

/** The key of the shades, wrapped to the width of the figure; returns its bottom. */
export function drawReachKey(page: SvgPart, layout: MeshFigureLayout, top: number): number {
  const group = page.add('g', { 'id': 'reach-key', 'font-size': SMALL_TEXT });
  const line = Math.max(SWATCH, SMALL_TEXT) + GAP;
  let x = MARGIN;
  let y = top + GAP;
  const baseline = (): number => y + SWATCH / 2 + 0.36 * SMALL_TEXT;
  group.addText('text', LABEL, { x, y: baseline() });
  x += guardedTextWidth(LABEL, SMALL_TEXT) + 2 * GAP;
  for (const { colour, label } of CLASSES) {
    const width = SWATCH + GAP + guardedTextWidth(label, SMALL_TEXT);
    if (x + width > layout.width - MARGIN && x > MARGIN) {
      x = MARGIN;
      y += line;
    }
    group.add('rect', {
      x,
      y,
      'width': SWATCH,
      'height': SWATCH,
      'fill': colour,
      'stroke': '#555555',
      'stroke-width': 0.13,
    });
    group.addText('text', label, { x: x + SWATCH + GAP, y: baseline() });
    x += width + 2.5 * GAP;
  }
  return y + line;
}
