import type { Chip } from '../chip/Chip.js';
import type { Shifter } from '../chip/shifters.js';
import { phaseOf } from '../chip/shifters.js';
import { isStuck } from '../chip/stuckShifters.js';
import { drawHand } from './drawHand.js';
import type { MeshPen } from './MeshPen.js';
import type { MeshFigureLayout } from './meshFigureLayout.js';
import { isExternalAbove, isInternalAbove, numberBaseline, SMALL_TEXT } from './meshFigureLayout.js';
import { phaseColour } from './phaseColour.js';
import { phaseLabel } from './phaseLabel.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';
import { guardedTextWidth } from './textWidth.js';

/** One shifter as a group: what it is as a title, its block or two, and its number. */
export function drawShifter(parent: SvgPart, pen: MeshPen, shifter: Shifter): void {
  const { layout, guideY, chip } = pen;
  const number = shifter.index + 1;
  const phase = phaseOf(pen.settings, shifter);
  const group = parent.add('g', { 'id': `shifter-${number}`, 'data-shifter': number });
  group.addText('title', describeShifter(chip, shifter, phase));
  const x = shifterCentre(layout, shifter);
  const y = guideY(shifter.portIndex);
  const stuck = isStuck(chip, shifter.index);
  drawPhaseBlock(group, layout, x, y, phase, stuck);
  const pair = shifter.role === 'internal' && chip.style.internal === 'differential';
  if (pair) drawPhaseBlock(group, layout, x, guideY(shifter.portIndex + 1), phase, stuck);
  if (layout.numbers) drawNumber(group, pen, shifter, phase);
}

/**
 * A square in the phase's colour with a hand that points along the phase, counterclockwise from the right.
 */
function drawPhaseBlock(
  group: SvgPart,
  layout: MeshFigureLayout,
  x: number,
  y: number,
  phase: number,
  stuck: boolean,
): void {
  const size = layout.block;
  const stroke = Math.min(0.13, 0.12 * size);
  const edge = stuck
    ? { 'stroke': '#c01050', 'stroke-width': 2.2 * stroke, 'stroke-dasharray': rounded(size / 5) }
    : { 'stroke': '#222222', 'stroke-width': stroke };
  group.add('rect', {
    class: 'block',
    x: x - size / 2,
    y: y - size / 2,
    width: size,
    height: size,
    rx: 0.14 * size,
    fill: phaseColour(phase),
    ...edge,
  });
  if (layout.hands) drawHand(group, x, y, size, phase);
}

/** Centre of a shifter's block along the guides. */
function shifterCentre(layout: MeshFigureLayout, shifter: Shifter): number {
  if (shifter.columnIndex === null) return layout.portColumn + layout.portColumnWidth / 2;
  const place = shifter.role === 'external' ? layout.cell.external : layout.cell.internal;
  return layout.firstColumn + shifter.columnIndex * layout.columnWidth + place;
}

function drawNumber(group: SvgPart, pen: MeshPen, shifter: Shifter, phase: number): void {
  const place = shifter.cellIndex === null ? portNumberPlace(pen, shifter) : cellNumberPlace(pen, shifter);
  group.addText('text', phaseLabel(phase), {
    'class': 'number',
    'x': place.x,
    'y': place.y,
    'font-size': SMALL_TEXT,
    'text-anchor': 'middle',
  });
}

interface Point {
  readonly x: number;
  readonly y: number;
}

function portNumberPlace({ layout, guideY }: MeshPen, shifter: Shifter): Point {
  return {
    x: shifterCentre(layout, shifter),
    y: guideY(shifter.portIndex) + numberBaseline(layout, true, 0),
  };
}

/** Outside the cell, above its upper guide or below its lower one, and within the cell's column. */
function cellNumberPlace(pen: MeshPen, shifter: Shifter): Point {
  const { layout, chip, guideY } = pen;
  const isExternal = shifter.role === 'external';
  const above = isExternal ? isExternalAbove(chip.style) : isInternalAbove(chip.style);
  const sharesSide = isExternalAbove(chip.style) === isInternalAbove(chip.style);
  const upperGuide = pen.chip.mesh.upperPortIndex[shifter.cellIndex!]!;
  const left = layout.firstColumn + shifter.columnIndex! * layout.columnWidth;
  const centres = numberCentres(pen, shifter.cellIndex!, sharesSide && layout.numbersInOneLine);
  return {
    x: left + (isExternal ? centres.external : centres.internal),
    y:
      guideY(above ? upperGuide : upperGuide + 1) +
      numberBaseline(layout, above, sharesSide ? lineOf(pen, isExternal, above) : 0),
  };
}

/** Of two lines on one side, the upper one is the number that the light meets first. */
function lineOf({ layout, chip }: MeshPen, isExternal: boolean, above: boolean): number {
  if (layout.numbersInOneLine) return 0;
  const metFirst = isExternal === chip.style.external.endsWith('input');
  return metFirst === above ? 1 : 0;
}

/**
 * Centres of a cell's numbers, from the column's left edge: over their blocks as far as the column allows.
 */
function numberCentres(
  { layout, settings, chip }: MeshPen,
  cell: number,
  sideBySide: boolean,
): { readonly external: number; readonly internal: number } {
  const width = layout.columnWidth;
  const half = (phase: number): number => guardedTextWidth(phaseLabel(phase), SMALL_TEXT) / 2;
  const within = (centre: number, room: number): number =>
    Math.max(room + 0.1, Math.min(width - room - 0.1, centre));
  const external = within(layout.cell.external, half(settings.external[cell]!));
  const internal = within(layout.cell.internal, half(settings.internal[cell]!));
  if (!sideBySide) return { external, internal };
  const apart = half(settings.external[cell]!) + half(settings.internal[cell]!) + 0.6;
  const sign = chip.style.external.endsWith('input') ? 1 : -1;
  return {
    external,
    internal: sign > 0 ? Math.max(internal, external + apart) : Math.min(internal, external - apart),
  };
}

/** For example `shifter 12 (H12), internal, cell 6, column 2, port 3: 1.2315 rad, 0.392π`. */
function describeShifter(chip: Chip, shifter: Shifter, phase: number): string {
  const name = chip.shifterNames.get(shifter.index);
  const where =
    shifter.cellIndex === null ? '' : `, cell ${shifter.cellIndex + 1}, column ${shifter.columnIndex! + 1}`;
  const pair = shifter.role === 'internal' && chip.style.internal === 'differential';
  const port = pair
    ? `ports ${shifter.portIndex + 1} (half the phase) and ${shifter.portIndex + 2} (minus half)`
    : `port ${shifter.portIndex + 1}`;
  const stuck = isStuck(chip, shifter.index) ? 'stuck ' : '';
  return (
    `${stuck}shifter ${shifter.index + 1}${name === undefined ? '' : ` (${name})`}, ${shifter.role}${where}, ${port}: ` +
    `${phase.toFixed(4)} rad, ${phaseLabel(phase)}`
  );
}
