import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { drawLegend } from './drawLegend.js';
import { drawColumnNumbers } from './drawColumnNumbers.js';
import { drawMesh } from './drawMesh.js';
import { drawPortLabels } from './drawPortLabels.js';
import { drawReach, drawReachKey } from './drawReach.js';
import type { FigureWidth, MeshFigureLayout } from './meshFigureLayout.js';
import {
  LABEL_GAP,
  MARGIN,
  meshFigureLayout,
  numberBaseline,
  POINT,
  SMALL_TEXT,
} from './meshFigureLayout.js';
import { portLabel } from './portLabel.js';
import { phaseLabel } from './phaseLabel.js';
import { printableText } from './printableText.js';
import type { SvgPart } from './SvgPage.js';
import { rounded, svgText } from './SvgPage.js';
import { guardedTextWidth, wrapText } from './textWidth.js';

export const FONTS = "Helvetica, Arial, 'Liberation Sans', 'DejaVu Sans', sans-serif";
export const TITLE_TEXT = 8 * POINT;
export const CAPTION_TEXT = 7 * POINT;
/**
 * The widest number of phases in [0, 2 pi); columns do not depend on the settings as long as phases are
 * wrapped.
 */
const USUAL_NUMBER = '0.000π';

/** What may be chosen of a mesh figure. */
export interface MeshFigureOptions {
  readonly title?: string;
  /** Lines below the figure, such as target, layout and fidelity; each is wrapped to the width. */
  readonly captionLines?: readonly string[];
  /**
   * Printed width: `one-column` 85 mm, `two-column` 178 mm, or millimetres from 30 to 5000. By default the
   * smaller of the two in which the mesh is legible, and wider only where numbers do not fit in 178 mm.
   */
  readonly width?: FigureWidth;
  /**
   * Whether phases are written, in multiples of pi. By default up to 12 ports, where a given width has room
   * for them.
   */
  readonly numbers?: boolean;
  /**
   * Whether cells are numbered in the drawing, where they have room; their titles hold the number in any
   * case.
   */
  readonly cellNumbers?: boolean;
  /**
   * For each cell the bar power between what is wanted of it and the nearer end of its reach, below 0 where it
   * cannot be done: cells are then shaded by it.
   */
  readonly cellMargins?: readonly number[];
}

/**
 * The mesh of a chip with the phases of all its shifters, as the text of an SVG document for print: guides
 * from left to right, cells with their splitters, shifters where they stand on the chip. Sizes are millimetres,
 * no text is smaller than 6 pt. Each cell is a group `cell-K`, each shifter a group `shifter-K`, both counted
 * from 1 and with a title that a viewer shows. The same arguments give the same bytes. Cost: about 0.2 ms a
 * cell.
 * @param settings phases in radians, of the chip's shape
 * @throws RangeError for settings that are not of the chip's shape, or not finite; InputError for a width out
 * of range or
 *   too small for what is asked (see `meshFigureLayout`)
 */
export function drawMeshFigure(chip: Chip, settings: Settings, options: MeshFigureOptions = {}): string {
  checkSettings(chip, settings);
  if (options.cellMargins && options.cellMargins.length !== chip.mesh.cells) {
    throw new RangeError(`${options.cellMargins.length} margins for ${chip.mesh.cells} cells`);
  }
  const layout = meshFigureLayout(chip, {
    width: options.width,
    numbers: options.numbers,
    numberWidth: widestNumber(settings),
    portNumberWidth: guardedTextWidth(String(chip.mesh.modes), SMALL_TEXT) + LABEL_GAP,
    portLabelWidth: widestPortLabel(chip),
  });
  const title = printableText(options.title ?? '');
  const titleLines = title === '' ? [] : wrapText(title, layout.width - 2 * MARGIN, TITLE_TEXT, true);
  const firstGuide = MARGIN + titleLines.length * 1.2 * TITLE_TEXT + headroom(layout);
  const guideY = (port: number): number => firstGuide + port * layout.pitch;
  const columnBaseline = guideY(chip.mesh.modes - 1) + footroom(layout) + SMALL_TEXT;
  const legendTop = columnBaseline + (chip.mesh.columns === 0 ? 0 : 0.9 * SMALL_TEXT);
  const pen = { chip, settings, layout, guideY };

  // The height is known only when the legend and the caption are drawn; the root's attributes come first all
  // the same.
  let height = 0;
  const body = (page: SvgPart): void => {
    page.addText('title', title === '' ? `Mesh of ${chip.name}` : title);
    page.addText('desc', describeFigure(chip));
    page.add('rect', { id: 'paper', width: '100%', height: '100%', fill: '#ffffff' });
    drawLines(page, 'title', titleLines, TITLE_TEXT, MARGIN + 0.8 * TITLE_TEXT, true);
    if (options.cellMargins) drawReach(page, pen, options.cellMargins);
    drawMesh(page, pen, options.cellNumbers === true && hasRoomForCellNumbers(chip, layout));
    drawPortLabels(page, pen);
    drawColumnNumbers(page, pen, columnBaseline);
    let legendBottom = drawLegend(page, chip, layout, legendTop);
    if (options.cellMargins) legendBottom = drawReachKey(page, layout, legendBottom);
    height = drawCaption(page, options.captionLines ?? [], layout, legendBottom) + MARGIN;
  };
  return svgText(body, () => ({
    'role': 'img',
    'width': `${rounded(layout.width)}mm`,
    'height': `${rounded(height)}mm`,
    'viewBox': `0 0 ${rounded(layout.width)} ${rounded(height)}`,
    'font-family': FONTS,
    'fill': '#111111',
  }));
}

function checkSettings({ mesh, portShifters }: Chip, { external, internal, port }: Settings): void {
  const portCount = portShifters ? mesh.modes : 0;
  if (external.length !== mesh.cells || internal.length !== mesh.cells || (port?.length ?? 0) !== portCount) {
    throw new RangeError(
      `the settings are not those of a chip with ${mesh.cells} cells and ${portCount} port shifters`,
    );
  }
  for (const phases of [external, internal, port ?? []]) {
    for (const phase of phases)
      if (!Number.isFinite(phase)) throw new RangeError(`a phase is ${phase}, not a number`);
  }
}

function widestNumber({ external, internal, port }: Settings): number {
  let widest = guardedTextWidth(USUAL_NUMBER, SMALL_TEXT);
  for (const phases of [external, internal, port ?? []]) {
    for (const phase of phases) widest = Math.max(widest, guardedTextWidth(phaseLabel(phase), SMALL_TEXT));
  }
  return widest;
}

function widestPortLabel(chip: Chip): number {
  let widest = 0;
  for (let port = 0; port < chip.mesh.modes; port++) {
    widest = Math.max(widest, guardedTextWidth(printableText(portLabel(chip, port)), SMALL_TEXT));
  }
  return widest + LABEL_GAP;
}

/** Above the first guide: its numbers, or a block. */
function headroom(layout: MeshFigureLayout): number {
  if (!layout.numbers) return Math.max(layout.block, SMALL_TEXT) / 2 + 1;
  const lines = Math.max(layout.numberLines.above, layout.portColumnWidth > 0 ? 1 : 0);
  return lines === 0 ? layout.block : 0.8 * SMALL_TEXT - numberBaseline(layout, true, lines - 1) + 0.4;
}

/** Below the last guide, down to the top of the column numbers. */
function footroom(layout: MeshFigureLayout): number {
  const lines = layout.numberLines.below;
  return lines === 0 ? layout.block / 2 + 0.8 : numberBaseline(layout, false, lines - 1) + 1.2;
}

/** The widest cell number must fit between the two splitters of the arms. */
function hasRoomForCellNumbers(chip: Chip, layout: MeshFigureLayout): boolean {
  const { arm, bend } = layout.cell;
  const between = arm + 2 * bend;
  const tall = layout.pitch - 2 * layout.block >= SMALL_TEXT;
  return tall && guardedTextWidth(String(chip.mesh.cells), SMALL_TEXT) + 0.4 <= between - bend * 0.6;
}

export function drawLines(
  page: SvgPart,
  id: string,
  lines: readonly string[],
  size: number,
  y: number,
  bold: boolean,
): void {
  if (lines.length === 0) return;
  const weight = bold ? { 'font-weight': 'bold' } : {};
  const group = page.add('g', { 'id': `${id}-lines`, 'font-size': size, ...weight });
  lines.forEach((line, i) => group.addText('text', line, { x: MARGIN, y: y + i * 1.2 * size }));
}

/** Returns the bottom of the caption. */
function drawCaption(
  page: SvgPart,
  captionLines: readonly string[],
  layout: MeshFigureLayout,
  top: number,
): number {
  const lines = captionLines.flatMap((line) =>
    wrapText(printableText(line), layout.width - 2 * MARGIN, CAPTION_TEXT),
  );
  const first = top + 0.6 + CAPTION_TEXT;
  drawLines(page, 'caption', lines, CAPTION_TEXT, first, false);
  return lines.length === 0 ? top : first + ((lines.length - 1) * 1.2 + 0.3) * CAPTION_TEXT;
}

function describeFigure({ name, mesh, style, portShifters }: Chip): string {
  const mirror = mesh.mirror === 'none' ? '' : `, mirrored: ${mesh.mirror}`;
  return (
    `${mesh.layout} mesh${mirror} of the chip ${name}: ${mesh.modes} ports, ${mesh.cells} cells in ${mesh.columns} columns, ` +
    `${portShifters ? 'with' : 'without'} port shifters; light travels from left to right. Cells: external phase ` +
    `${style.external}, internal phase ${style.internal}, ${style.splitters === 3 ? 'three ' : ''}${style.splitterForm} splitters. Phases in multiples of pi.`
  );
}
