import { listShifters, shifterIndicesOfCell } from '../chip/shifters.js';
import { drawShifter } from './drawShifter.js';
import { guidePaths } from './guidePaths.js';
import type { MeshFigureLayout } from './meshFigureLayout.js';
import { HALF_DIGIT, SMALL_TEXT } from './meshFigureLayout.js';
import type { MeshPen } from './MeshPen.js';
import { phaseLabel } from './phaseLabel.js';
import { portWithName } from './portLabel.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';

/** The guides, the cells with their shifters, and the port shifters. */
export function drawMesh(page: SvgPart, pen: MeshPen, cellNumbers: boolean): void {
  const { chip, layout, guideY } = pen;
  const group = page.add('g', { id: 'mesh' });
  group.add('path', {
    'id': 'guides',
    'd': guidePaths(chip.mesh, layout, guideY),
    'fill': 'none',
    'stroke': layout.hands ? '#333333' : '#707070',
    'stroke-width': layout.lineWidth,
    'stroke-linejoin': 'round',
  });
  if (chip.style.splitterForm === 'real') drawSplitterMarks(group, pen);
  const shifters = listShifters(chip);
  for (let cell = 0; cell < chip.mesh.cells; cell++) {
    const cellGroup = drawCell(group, pen, cell, cellNumbers);
    const { external, internal } = shifterIndicesOfCell(chip, cell);
    for (const index of [external, internal].sort((a, b) => a - b))
      drawShifter(cellGroup, pen, shifters[index]!);
  }
  for (const shifter of shifters) if (shifter.cellIndex === null) drawShifter(group, pen, shifter);
}

/** The cell's group, with a title over its whole area and its number in the middle. */
function drawCell(group: SvgPart, pen: MeshPen, cell: number, cellNumbers: boolean): SvgPart {
  const { chip, layout, guideY } = pen;
  const x = layout.firstColumn + chip.mesh.columnIndex[cell]! * layout.columnWidth;
  const y = guideY(chip.mesh.upperPortIndex[cell]!);
  const cellGroup = group.add('g', { 'id': `cell-${cell + 1}`, 'data-cell': cell + 1 });
  cellGroup.addText('title', describeCell(pen, cell));
  cellGroup.add('rect', {
    'class': 'area',
    'x': x,
    'y': y - layout.pitch / 2,
    'width': layout.columnWidth,
    'height': 2 * layout.pitch,
    'fill': 'none',
    'pointer-events': 'all',
  });
  if (cellNumbers) {
    cellGroup.addText('text', String(cell + 1), {
      'class': 'cell-number',
      'x': x + layout.cell.internal,
      'y': y + layout.pitch / 2 + HALF_DIGIT,
      'font-size': SMALL_TEXT,
      'text-anchor': 'middle',
      'fill': '#666666',
    });
  }
  return cellGroup;
}

/** A dot on the outer side of the lower guide at each real splitter: light that stays on it changes sign. */
function drawSplitterMarks(group: SvgPart, { chip, layout, guideY }: MeshPen): void {
  const { splitters, bend, coupling, spacing } = layout.cell;
  const radius = splitterMarkRadius(layout);
  const dots: string[] = [];
  for (let cell = 0; cell < chip.mesh.cells; cell++) {
    const x = layout.firstColumn + chip.mesh.columnIndex[cell]! * layout.columnWidth;
    const y =
      guideY(chip.mesh.upperPortIndex[cell]!) +
      (layout.pitch + spacing) / 2 +
      layout.lineWidth / 2 +
      1.6 * radius;
    for (const splitter of splitters) dots.push(dotPath(x + splitter + bend + coupling / 2, y, radius));
  }
  group.add('path', { id: 'splitter-marks', d: dots.join(''), fill: '#333333' });
}

function splitterMarkRadius(layout: MeshFigureLayout): number {
  return Math.min(0.28, 0.05 * layout.columnWidth);
}

/** A full circle as path data. */
function dotPath(x: number, y: number, radius: number): string {
  const r = rounded(radius);
  return `M${rounded(x - radius)} ${rounded(y)}a${r} ${r} 0 1 0 ${2 * r} 0a${r} ${r} 0 1 0 ${-2 * r} 0z`;
}

function describeCell({ chip, settings }: MeshPen, cell: number): string {
  const port = chip.mesh.upperPortIndex[cell]!;
  const phase = (value: number): string => `${value.toFixed(4)} rad (${phaseLabel(value)})`;
  const { splitters } = chip.style;
  const shown = Array.from(chip.couplingRatios.subarray(splitters * cell, splitters * (cell + 1)), (ratio) =>
    String(Number(ratio.toFixed(4))),
  );
  return (
    `cell ${cell + 1}, column ${chip.mesh.columnIndex[cell]! + 1}, ports ${portWithName(chip, port)} and ` +
    `${portWithName(chip, port + 1)}; external phase ${phase(settings.external[cell]!)}, internal phase ` +
    `${phase(settings.internal[cell]!)}; coupling ratios ${shown.slice(0, -1).join(', ')} and ${shown.at(-1)}`
  );
}
