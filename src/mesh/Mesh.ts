/** Where the cells stand: `rectangular` as Clements et al. 2016, `triangular` as Reck et al. 1994. */
export const LAYOUTS = ['rectangular', 'triangular'] as const;
/** A layout of cells. */
export type Layout = (typeof LAYOUTS)[number];

/** `ports`: port p at the place of port N+1-p. `columns`: the columns in reverse order. */
export const MIRRORS = ['none', 'ports', 'columns', 'both'] as const;
/** A way in which a mesh is mirrored. */
export type Mirror = (typeof MIRRORS)[number];

/**
 * The places of all cells of a mesh. Cells are held in the order of their numbers: column by column, top to
 * bottom in a column, an order in which light can meet them. Cell number k (from 1) has index k - 1.
 */
export interface Mesh {
  readonly modes: number;
  readonly layout: Layout;
  readonly mirror: Mirror;
  /** Number of columns: N (1 for N = 2, 0 for N = 1) or 2N - 3 (0 for N = 1). */
  readonly columns: number;
  /** Number of cells, N(N-1)/2. */
  readonly cells: number;
  /** Per cell, index (from 0) of the upper of its two ports; the lower one is the next. */
  readonly upperPortIndex: Int32Array;
  /** Per cell, index (from 0) of its column. */
  readonly columnIndex: Int32Array;
  /** Per column, index of its first cell; one more entry at the end holds the number of cells. */
  readonly firstCellOfColumn: Int32Array;
}

/** The number of columns of a layout; a column without a cell does not exist. */
export function columnCount(layout: Layout, modes: number): number {
  if (modes < 2) return 0;
  if (layout === 'triangular') return 2 * modes - 3;
  return modes === 2 ? 1 : modes;
}

/**
 * The mesh of a layout for `modes` ports. Rectangular: Clements et al., Optica 3, 1460 (2016), column c (from
 * 1) starts at port 1 for odd c, at port 2 for even c. Triangular: Reck et al., Phys. Rev. Lett. 73, 58
 * (1994), the cells on ports (m, m+1) stand in columns m, m+2, ..., 2N-2-m.
 * @param modes number of ports, a whole number of at least 1
 * @throws RangeError for any other number
 */
export function createMesh(layout: Layout, modes: number, mirror: Mirror = 'none'): Mesh {
  if (!(Number.isInteger(modes) && modes >= 1)) {
    throw new RangeError(`a mesh has a whole number of ports, at least 1, not ${modes}`);
  }
  const columns = columnCount(layout, modes);
  const cells = (modes * (modes - 1)) / 2;
  const upperPortIndex = new Int32Array(cells);
  const columnIndex = new Int32Array(cells);
  const firstCellOfColumn = new Int32Array(columns + 1);
  const portsMirrored = mirror === 'ports' || mirror === 'both';
  const columnsMirrored = mirror === 'columns' || mirror === 'both';
  let cell = 0;
  for (let column = 0; column < columns; column++) {
    firstCellOfColumn[column] = cell;
    const [first, last] = portsOfColumn(layout, modes, columnsMirrored ? columns - 1 - column : column);
    for (let port = first; port <= last; port += 2) {
      // Exchanging top and bottom sends ports (m, m+1) to (N-2-m, N-1-m), counted from 0, and the last cell
      // to the top.
      upperPortIndex[cell] = portsMirrored ? modes - 2 - (last - (port - first)) : port;
      columnIndex[cell] = column;
      cell++;
    }
  }
  firstCellOfColumn[columns] = cell;
  return { modes, layout, mirror, columns, cells, upperPortIndex, columnIndex, firstCellOfColumn };
}

/**
 * The other mirror by which a layout has its cells at the very same places: a rectangle with an even number
 * of ports may be turned upside down, any other mesh may have its columns in reverse order.
 */
export function coincidentMirror({ layout, modes, mirror }: Mesh): Mirror {
  const upsideDown = layout === 'rectangular' && modes % 2 === 0;
  const ports = (mirror === 'ports' || mirror === 'both') === !upsideDown;
  const columns = (mirror === 'columns' || mirror === 'both') === upsideDown;
  return ports ? (columns ? 'both' : 'ports') : columns ? 'columns' : 'none';
}

/**
 * Index (from 0) of the cell in a column whose upper port is `port` (index from 0); the place must hold a
 * cell.
 */
export function cellIndexAt(mesh: Mesh, column: number, port: number): number {
  const first = mesh.firstCellOfColumn[column]!;
  return first + (port - mesh.upperPortIndex[first]!) / 2;
}

/** Indices (from 0) of the first and last upper port in a column of the mesh that is not mirrored. */
function portsOfColumn(layout: Layout, modes: number, column: number): [first: number, last: number] {
  if (layout === 'rectangular') {
    const first = column % 2;
    return [first, first + 2 * (Math.floor((modes - first) / 2) - 1)];
  }
  // Cells (m, m+1) exist from column m to column 2N-4-m (all from 0), so m <= min(column, 2N-4-column).
  const last = Math.min(column, 2 * modes - 4 - column);
  return [column % 2, last];
}
