import type { BesideFactors, MeshReach } from '../chip/MeshReach.js';
import { fullReach } from '../chip/MeshReach.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';
import { cellIndexAt } from '../mesh/Mesh.js';
import type { Decomposition } from './Decomposition.js';
import type { Mirrored, Nulling } from './Nulling.js';
import type { Rotations } from './Rotations.js';
import { createRotations } from './Rotations.js';

/**
 * Entries up to NEGLIGIBLE N eps count as zero: rounding in the nulling itself was seen to stay below 2 N
 * eps.
 */
const NEGLIGIBLE = 4;

/**
 * What `decompose` does, by a nulling of one's choice.
 * @throws RangeError when the target's shape is not that of the mesh, or the reach is for another number of
 * cells
 */
export function decomposeWith(
  nulling: Nulling,
  target: ComplexMatrix,
  mesh: Mesh,
  reach: MeshReach | null = null,
): Decomposition {
  const { modes, cells, layout, mirror } = mesh;
  if (target.rows !== modes || target.columns !== modes) {
    throw new RangeError(`the mesh has ${modes} ports, the target is ${target.rows} x ${target.columns}`);
  }
  if (reach !== null && !isForCells(reach, cells)) {
    throw new RangeError(`the mesh has ${cells} cells, the reach is that of ${reach.leastBar.length}`);
  }
  const mirrored: Mirrored = {
    ports: mirror === 'ports' || mirror === 'both',
    columns: mirror === 'columns' || mirror === 'both',
  };
  const negligible = NEGLIGIBLE * modes * Number.EPSILON;
  const { places, diagonalBefore } = placesOf(mesh, mirrored);
  const plainReach = places && reach ? takeFromPlaces(reach, places, mirrored) : reach;
  const { rotations, diagonal } = nulling(target, layout, mirrored, negligible * negligible, plainReach);
  const { cosine, sineRe, sineIm } = places ? putAtPlaces(rotations, places, mirrored) : rotations;
  if (mirrored.ports) diagonal.reverse();
  return { mesh, cosine, sineRe, sineIm, diagonal, diagonalBefore };
}

/** Where the nulling's results stand on a mesh: to find out costs as much as the nulling of a small one. */
interface Places {
  /** Null on a mesh that is not mirrored. */
  readonly places: Int32Array | null;
  readonly diagonalBefore: Int32Array;
}

const placesOfMeshes = new WeakMap<Mesh, Places>();

function placesOf(mesh: Mesh, mirrored: Mirrored): Places {
  let found = placesOfMeshes.get(mesh);
  if (found === undefined) {
    const places = mesh.mirror === 'none' ? null : placesOnMesh(mesh, mirrored);
    placesOfMeshes.set(mesh, (found = { places, diagonalBefore: placeDiagonal(mesh, mirrored) }));
  }
  return found;
}

function isForCells({ leastBar, leastCross, beside }: MeshReach, cells: number): boolean {
  const besideFits = beside === undefined || beside.matrices.length === 8 * cells;
  return leastBar.length === cells && leastCross.length === cells && besideFits;
}

/** Per cell of the plain mesh, index of the same cell on the mirrored one. */
function placesOnMesh({ cells, columns, firstCellOfColumn }: Mesh, mirrored: Mirrored): Int32Array {
  const places = new Int32Array(cells);
  let cell = 0;
  for (let plainColumn = 0; plainColumn < columns; plainColumn++) {
    const column = mirrored.columns ? columns - 1 - plainColumn : plainColumn;
    const first = firstCellOfColumn[column]!;
    const last = firstCellOfColumn[column + 1]! - 1;
    for (let inColumn = 0; inColumn <= last - first; inColumn++) {
      places[cell++] = mirrored.ports ? last - inColumn : first + inColumn;
    }
  }
  return places;
}

/** The reach of the mirrored mesh's cells in the order of the plain one; no mirror changes powers. */
function takeFromPlaces(
  { leastBar, leastCross, beside }: MeshReach,
  places: Int32Array,
  mirrored: Mirrored,
): MeshReach {
  const plain = fullReach(places.length);
  for (let cell = 0; cell < places.length; cell++) {
    plain.leastBar[cell] = leastBar[places[cell]!]!;
    plain.leastCross[cell] = leastCross[places[cell]!]!;
  }
  return beside ? { ...plain, beside: takeBeside(beside, places, mirrored) } : plain;
}

/** X Q X for a mesh that is upside down, Q^T on the other side for one in reverse order. */
function takeBeside(
  { matrices, onLeft }: BesideFactors,
  places: Int32Array,
  { ports, columns }: Mirrored,
): BesideFactors {
  const plain = new Float64Array(matrices.length);
  for (let cell = 0; cell < places.length; cell++) {
    for (let entry = 0; entry < 4; entry++) {
      const turned = ports ? 3 - entry : entry;
      const from = columns && (turned === 1 || turned === 2) ? 3 - turned : turned;
      plain[8 * cell + 2 * entry] = matrices[8 * places[cell]! + 2 * from]!;
      plain[8 * cell + 2 * entry + 1] = matrices[8 * places[cell]! + 2 * from + 1]!;
    }
  }
  return { matrices: plain, onLeft: onLeft !== columns };
}

/** Carries the factors of the plain mesh to the cells of the mirrored one. */
function putAtPlaces(plain: Rotations, places: Int32Array, mirrored: Mirrored): Rotations {
  const placed = createRotations(places.length);
  // X W X and W^T both turn s into -conj(s); together they leave it as it was.
  const conjugated = mirrored.ports !== mirrored.columns;
  for (let cell = 0; cell < places.length; cell++) {
    const place = places[cell]!;
    placed.cosine[place] = plain.cosine[cell]!;
    placed.sineRe[place] = conjugated ? -plain.sineRe[cell]! : plain.sineRe[cell]!;
    placed.sineIm[place] = plain.sineIm[cell]!;
  }
  return placed;
}

/**
 * Per port, index of the first cell on it that the light meets behind the diagonal; the number of cells if
 * none.
 *
 * On a plain rectangle the cells behind the diagonal are those that nulling finds by rows: step k of diagonal
 * d gives column N-1-k, port N-2-d+k (from 0), with a sum of at least N-1, whereas column k and port d-k of
 * those found by columns have a sum of at most N-2. Sums are even. So the first cells behind lie on one
 * oblique line, the last ones before on the line next to it; with the columns in reverse order the latter are
 * the first behind. A plain triangle has no cell behind the diagonal, and one in reverse order none before
 * it.
 */
function placeDiagonal(mesh: Mesh, mirrored: Mirrored): Int32Array {
  const { modes, layout, cells, columns } = mesh;
  const diagonalBefore = new Int32Array(modes).fill(cells);
  if (layout === 'triangular' && !mirrored.columns) return diagonalBefore;
  const leastSumBehind = modes - (modes % 2);
  for (let port = 0; port < modes; port++) {
    const plainPort = mirrored.ports ? modes - 1 - port : port;
    // Of the two cells of the line on the port, the one that the light meets first; at its ends there is one.
    const upper = mirrored.columns ? Math.max(plainPort - 1, 0) : Math.min(plainPort, modes - 2);
    const behindOnPlain = leastSumBehind - upper;
    let column = mirrored.columns ? columns - 1 - (behindOnPlain - 2) : behindOnPlain;
    if (layout === 'triangular') column = upper;
    if (column < 0 || column >= columns) continue;
    diagonalBefore[port] = cellIndexAt(mesh, column, mirrored.ports ? modes - 2 - upper : upper);
  }
  return diagonalBefore;
}
