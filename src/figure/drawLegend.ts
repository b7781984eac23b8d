import type { Chip } from '../chip/Chip.js';
import { stuckShifters } from '../chip/stuckShifters.js';
import { drawHand } from './drawHand.js';
import { columnWord } from './drawColumnNumbers.js';
import type { MeshFigureLayout } from './meshFigureLayout.js';
import { isExternalAbove, isInternalAbove, MARGIN, SMALL_TEXT } from './meshFigureLayout.js';
import { phaseColour } from './phaseColour.js';
import type { SvgPart } from './SvgPage.js';
import { wrapText } from './textWidth.js';

const STRIP_LENGTH = 26;
const STRIP_HEIGHT = 2.4;
const TICKS = ['0', 'π/2', 'π', '3π/2', '2π'] as const;
const LINE = 1.2 * SMALL_TEXT;
const STOPS = 32;
/** Room beside the scale below which the notes stand under it. */
const LEAST_NOTE_WIDTH = 40;

/**
 * The colour scale over one turn, with the hands, and notes on how to read the figure; returns the bottom.
 */
export function drawLegend(page: SvgPart, chip: Chip, layout: MeshFigureLayout, top: number): number {
  const group = page.add('g', { 'id': 'legend', 'font-size': SMALL_TEXT });
  const left = MARGIN + 2;
  drawScale(group, layout, left, top);
  const scaleBottom = top + STRIP_HEIGHT + 1.25 * SMALL_TEXT;
  const beside = left + STRIP_LENGTH + 5;
  const isBeside = layout.width - MARGIN - beside >= LEAST_NOTE_WIDTH;
  const x = isBeside ? beside : MARGIN;
  const firstBaseline = isBeside ? top + 0.75 * SMALL_TEXT : scaleBottom + LINE;
  const lines = wrapText(legendNotes(chip, layout).join(' '), layout.width - MARGIN - x, SMALL_TEXT);
  lines.forEach((line, i) => group.addText('text', line, { x, y: firstBaseline + i * LINE }));
  return Math.max(scaleBottom, firstBaseline + (lines.length - 1) * LINE + 0.25 * SMALL_TEXT);
}

function drawScale(group: SvgPart, layout: MeshFigureLayout, left: number, top: number): void {
  const gradient = group.add('defs').add('linearGradient', { id: 'phase-scale' });
  for (let stop = 0; stop <= STOPS; stop++) {
    const share = stop / STOPS;
    gradient.add('stop', { 'offset': String(share), 'stop-color': phaseColour(2 * Math.PI * share) });
  }
  group.add('rect', {
    'x': left,
    'y': top,
    'width': STRIP_LENGTH,
    'height': STRIP_HEIGHT,
    'fill': 'url(#phase-scale)',
    'stroke': '#222222',
    'stroke-width': 0.13,
  });
  TICKS.forEach((label, i) => {
    const share = i / (TICKS.length - 1);
    const x = left + STRIP_LENGTH * share;
    const inside = Math.max(left + STRIP_HEIGHT / 2, Math.min(left + STRIP_LENGTH - STRIP_HEIGHT / 2, x));
    if (layout.hands) drawHand(group, inside, top + STRIP_HEIGHT / 2, 1.6, 2 * Math.PI * share);
    group.addText('text', label, { x, 'y': top + STRIP_HEIGHT + SMALL_TEXT, 'text-anchor': 'middle' });
  });
}

function legendNotes(chip: Chip, layout: MeshFigureLayout): string[] {
  const notes = [
    layout.hands ? 'Square: phase shifter; its hand turns counterclockwise.' : 'Square: phase shifter.',
  ];
  if (stuckShifters(chip).length > 0) notes.push('Dashed edge: stuck.');
  if (chip.mesh.cells === 0) return notes;
  if (layout.numbers) notes.push(numbersNote(chip, layout));
  if (chip.style.internal === 'differential') {
    notes.push('Pair of squares: half the phase on the upper arm, minus half on the lower.');
  }
  if (chip.style.splitterForm === 'real') notes.push('Dot: real splitter, sign change on the dotted side.');
  if (columnWord(layout) === undefined) notes.push('Bottom row: columns.');
  return notes;
}

function numbersNote({ style }: Chip, layout: MeshFigureLayout): string {
  const externalAbove = isExternalAbove(style);
  if (externalAbove !== isInternalAbove(style)) {
    const [above, below] = externalAbove ? ['external', 'internal'] : ['internal', 'external'];
    return `Above a cell: ${above} phase; below: ${below} phase.`;
  }
  const order = style.external.endsWith('input') ? ['external', 'internal'] : ['internal', 'external'];
  return `${externalAbove ? 'Above' : 'Below'} a cell: ${order.join(layout.numbersInOneLine ? ', then ' : ' over ')} phase.`;
}
