import type { MeshReach } from '../chip/MeshReach.js';
import type { Kernels } from '../kernel/loadKernels.js';
import { loadKernels } from '../kernel/loadKernels.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Layout } from '../mesh/Mesh.js';
import type { Mirrored, NullingResult } from './Nulling.js';

/**
 * The nulling on WebAssembly kernels: the twin of `nullReadably`. Its memory stays for the next call and
 * grows with the largest target.
 */
export function nullOnKernels(
  target: ComplexMatrix,
  layout: Layout,
  mirrored: Mirrored,
  negligibleSquare: number,
  reach: MeshReach | null,
): NullingResult {
  const modes = target.rows;
  if (workspace === undefined || workspace.capacity < modes) workspace = createWorkspace(modes);
  const { kernels, results, entries, at } = workspace;
  const cells = (modes * (modes - 1)) / 2;
  const rowBytes = bytesOfRow(modes);
  const matrix = at.matrix + ROWS_ABOVE * rowBytes;
  takeTarget(workspace, target, mirrored, matrix, rowBytes);
  const nulling = layout === 'rectangular' ? kernels.nullRectangular : kernels.nullTriangular;
  takeReach(workspace, reach, cells);
  nulling(modes, matrix, rowBytes, negligibleSquare, at.reach, at.sweep, at.results, at.entries);
  // One array for all three, since making an array costs as much as nulling several entries.
  const factors = results.slice(0, 3 * cells);
  const rotations = {
    cosine: factors.subarray(0, cells),
    sineRe: factors.subarray(cells, 2 * cells),
    sineIm: factors.subarray(2 * cells),
  };
  const diagonal = new Float64Array(modes);
  for (let i = 0; i < modes; i++) diagonal[i] = Math.atan2(entries[2 * i + 1]!, entries[2 * i]!);
  return { rotations, diagonal };
}

/** The kernels with room for targets up to a size; the views are made once. */
interface Workspace {
  readonly capacity: number;
  readonly kernels: Kernels;
  /** The target's re, then its im. */
  readonly source: Float64Array;
  /** The least c and the least |s| of each cell. */
  readonly reach: Float64Array;
  /** How many doubles at the front of `reach` may differ from 0. */
  reachTaken: number;
  readonly results: Float64Array;
  readonly entries: Float64Array;
  /** Addresses in bytes. */
  readonly at: {
    readonly source: number;
    readonly matrix: number;
    readonly reach: number;
    readonly sweep: number;
    readonly results: number;
    readonly entries: number;
  };
}

let workspace: Workspace | undefined;

/** Rows above the first one that the kernels may write on. */
const ROWS_ABOVE = 3;
/** Bytes of a cache line: four columns. */
const LINE = 64;
/** A workspace has room for a multiple of this, so that targets that grow one by one do not make one each. */
const CAPACITY_STEP = 64;

/**
 * Bytes from row to row: an odd number of cache lines, since rows a power of two apart would fall on the same
 * lines of the cache.
 */
function bytesOfRow(modes: number): number {
  return LINE * (Math.ceil(modes / 4) | 1);
}

/**
 * A workspace has an instance of its own: one that has become too small is left to the garbage collector,
 * memory and all.
 */
function createWorkspace(modes: number): Workspace {
  const capacity = CAPACITY_STEP * Math.ceil(modes / CAPACITY_STEP);
  const resultsLength = (3 * capacity * (capacity - 1)) / 2;
  const reachLength = capacity * (capacity - 1);
  const memory = loadKernels();
  const at = {
    source: memory.reserve(2 * capacity * capacity),
    matrix: memory.reserveBytes((capacity + ROWS_ABOVE) * bytesOfRow(capacity)),
    reach: memory.reserve(reachLength),
    sweep: memory.reserve(4 * capacity),
    results: memory.reserve(resultsLength),
    entries: memory.reserve(2 * capacity),
  };
  return {
    capacity,
    kernels: memory.kernels,
    source: memory.doubles(at.source, 2 * capacity * capacity),
    reach: memory.doubles(at.reach, reachLength),
    reachTaken: 0,
    results: memory.doubles(at.results, resultsLength),
    entries: memory.doubles(at.entries, 2 * capacity),
    at,
  };
}

/** Lays the target out for the kernels, mirrored as the mesh is. */
function takeTarget(
  { kernels, source, at }: Workspace,
  { rows: modes, re, im }: ComplexMatrix,
  mirrored: Mirrored,
  matrix: number,
  rowBytes: number,
): void {
  source.set(re);
  source.set(im, modes * modes);
  const first = mirrored.ports ? modes * modes - 1 : 0;
  const direction = mirrored.ports ? -1 : 1;
  const rowStep = direction * (mirrored.columns ? 1 : modes);
  const columnStep = direction * (mirrored.columns ? modes : 1);
  kernels.layOutMatrix(modes, at.source, first, rowStep, columnStep, matrix, rowBytes);
}

/** Lays out what the cells can do; the zeros of cells that can do everything stay from call to call. */
function takeReach(own: Workspace, reach: MeshReach | null, cells: number): void {
  if (own.reachTaken > 0) own.reach.fill(0, 0, own.reachTaken);
  own.reachTaken = 0;
  if (reach === null) return;
  for (let cell = 0; cell < cells; cell++) {
    own.reach[2 * cell] = reach.leastBar[cell]!;
    own.reach[2 * cell + 1] = reach.leastCross[cell]!;
  }
  own.reachTaken = 2 * cells;
}
