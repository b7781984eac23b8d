import type { Mesh } from '../mesh/Mesh.js';
import type { MeshFigureLayout } from './meshFigureLayout.js';
import { rounded } from './SvgPage.js';

/** Path data of all guides, each from its left end to its right end, with its way through every cell. */
export function guidePaths(mesh: Mesh, layout: MeshFigureLayout, guideY: (port: number) => number): string {
  const starts = Array.from(
    { length: mesh.modes },
    (_, port) => `M${rounded(layout.guideStart)} ${rounded(guideY(port))}`,
  );
  const paths = starts.map((start) => [start]);
  for (let cell = 0; cell < mesh.cells; cell++) {
    const port = mesh.upperPortIndex[cell]!;
    const x = layout.firstColumn + mesh.columnIndex[cell]! * layout.columnWidth;
    const depth = (layout.pitch - layout.cell.spacing) / 2;
    paths[port]!.push(wayThroughCell(layout, x, guideY(port), depth));
    paths[port + 1]!.push(wayThroughCell(layout, x, guideY(port + 1), -depth));
  }
  return paths.map((path) => `${path.join('')}H${rounded(layout.guideEnd)}`).join('');
}

/** To the cell's middle, along the other guide, and back to the arm; and once more. */
function wayThroughCell(layout: MeshFigureLayout, x: number, y: number, depth: number): string {
  const { splitters, bend, coupling } = layout.cell;
  return splitters
    .map((splitter) => {
      const start = x + splitter;
      const close = start + bend;
      const apart = close + coupling;
      return (
        `H${rounded(start)}` +
        curve(start, y, close, y + depth) +
        `H${rounded(apart)}` +
        curve(apart, y + depth, apart + bend, y)
      );
    })
    .join('');
}

/** An S-bend, level at both ends. */
function curve(x0: number, y0: number, x1: number, y1: number): string {
  const middle = rounded((x0 + x1) / 2);
  return `C${middle} ${rounded(y0)} ${middle} ${rounded(y1)} ${rounded(x1)} ${rounded(y1)}`;
}
