import { KERNEL_MODULE } from './generated/kernelModule.js';

const PAGE = 65536;
/** Doubles that `solveCells` and `composeCells` need for the cells of a block, two trials. */
export const BLOCK_SIZE = 16 * 16;
/** Below this stand the constants of the compiled kernels. */
const FIRST_FREE = 65536;

/**
 * The kernels by name. They take addresses in bytes, whole numbers and doubles; they never check anything.
 */
export interface Kernels {
  seedTrials(state: number, seedLow: number, seedHigh: number, stream: number, first: number): void;
  /** `layers`: the tables of ziggurat.ts. */
  fillNormals(out: number, count: number, state: number, layers: number): void;
  fillUniforms(out: number, count: number, state: number): void;
  correlateGrid(grid: number, columns: number, rows: number, columnStep: number, rowStep: number): void;
  pickPlaces(out: number, stride: number, grid: number, places: number, count: number): void;
  correlatePairs(numbers: number, pairs: number, correlation: number): void;
  drawRatios(
    ratios: number,
    count: number,
    nominal: number,
    numbers: number,
    sigma: number,
    shift: number,
    clamped: number,
  ): void;
  turnRatios(ratios: number, count: number, numbers: number, sigma: number): void;
  turnFactors(factors: number, stride: number, count: number, numbers: number, sigma: number): void;
  solveCells(
    cells: number,
    modes: number,
    upperPort: number,
    ratios: number,
    wanted: number,
    diagonal: number,
    diagonalAt: number,
    carried: number,
    turns: number,
    arms: number,
    external: number,
    internalArm: number,
    onLower: number,
    againstLight: number,
    realSplitters: number,
    shifterLoss: number,
  ): void;
  composeCells(
    cells: number,
    upperPort: number,
    ratios: number,
    arms: number,
    external: number,
    gain: number,
    modes: number,
    input: number,
    factors: number,
    ways: number,
    coefficients: number,
    place: number,
    realSplitters: number,
    splitters: number,
  ): void;
  propagatePanel(
    modes: number,
    columns: number,
    firstInput: number,
    lane: number,
    ranges: number,
    upperPort: number,
    coefficients: number,
    panel: number,
  ): void;
  accumulatePanel(modes: number, panel: number, target: number, sums: number): void;
  judgeTrial(
    modes: number,
    columns: number,
    lane: number,
    ranges: number,
    upperPort: number,
    coefficients: number,
    panel: number,
    target: number,
    sums: number,
    factors: number,
    output: number,
    result: number,
  ): void;
  /**
   * Sends the fields of a panel through the mesh; with `keeps` the fields before each cell are appended at
   * `history`. See assembly/carry.ts.
   */
  carryFields(
    columns: number,
    ranges: number,
    upperPort: number,
    transfers: number,
    panel: number,
    history: number,
    keeps: number,
  ): void;
  /** Carries adjoint fields back from the outputs to the inputs and adds up the correlations of each cell. */
  carryAdjoints(
    columns: number,
    ranges: number,
    upperPort: number,
    transfers: number,
    panel: number,
    historyEnd: number,
    correlations: number,
  ): void;
  /**
   * Lays an N x N matrix out as the nulling kernels want it: see assembly/nullingMatrix.ts. Entry (i, j) is
   * double number `first` + i `rowStep` + j `columnStep` of the plane at `source`, N^2 doubles for re, then
   * as many for im.
   */
  layOutMatrix(
    modes: number,
    source: number,
    first: number,
    rowStep: number,
    columnStep: number,
    matrix: number,
    rowBytes: number,
  ): void;
  nullRectangular: NullingKernel;
  nullTriangular: NullingKernel;
}

/**
 * Nulls an N x N matrix; its memory layout is that of assembly/nullingMatrix.ts: the address of row 0, behind
 * three rows that are scribbled on; bytes from row to row. Squares up to `negligibleSquare` count as zero.
 * `reach` holds the least c and the least |s| of each cell, in mesh order. `sweep` has room for N - 1 rotations of 32 bytes. The results are c, re s and im s of the cells, N(N-1)/2
 * doubles each; `diagonalEntries` holds re and im of the N entries that are left.
 */
type NullingKernel = (
  modes: number,
  matrix: number,
  rowBytes: number,
  negligibleSquare: number,
  reach: number,
  sweep: number,
  results: number,
  diagonalEntries: number,
) => void;

/**
 * An instance of the compiled kernels with a memory of its own, in which arrays are laid out once. Not shared
 * between workers.
 *
 * The kernel contract: addresses are bytes, multiples of 16; arrays do not overlap; sizes and values have
 * been checked before.
 */
export interface KernelInstance {
  readonly kernels: Kernels;
  /**
   * Reserves an array of doubles. Views from before a growth of the memory are dead: reserve everything
   * first, then take views.
   */
  reserve(doubles: number): number;
  /** Reserves so many bytes. */
  reserveBytes(bytes: number): number;
  /** The doubles at an address. */
  doubles(address: number, length: number): Float64Array;
  /** The 32-bit whole numbers at an address. */
  integers(address: number, length: number): Int32Array;
  /** The bytes at an address. */
  bytes(address: number, length: number): Uint8Array;
}

let compiled: WebAssembly.Module | undefined;

/** Makes an instance; the module is compiled once. Needs WebAssembly with 128-bit SIMD. */
export function loadKernels(): KernelInstance {
  compiled ??= new WebAssembly.Module(decodeBase64(KERNEL_MODULE));
  const memory = new WebAssembly.Memory({ initial: 4 });
  const abort = (): never => {
    throw new Error('a kernel has stopped');
  };
  const instance = new WebAssembly.Instance(compiled, { env: { memory, abort } });
  let next = FIRST_FREE;
  const reserveBytes = (bytes: number): number => {
    const address = next;
    // A gap of a cache line keeps arrays of a power of two from falling on the same lines.
    next += Math.ceil(bytes / 64) * 64 + 64;
    const missing = next - memory.buffer.byteLength;
    if (missing > 0) memory.grow(Math.ceil(missing / PAGE));
    return address;
  };
  return {
    kernels: instance.exports as unknown as Kernels,
    reserve: (doubles) => reserveBytes(8 * doubles),
    reserveBytes,
    doubles: (address, length) => new Float64Array(memory.buffer, address, length),
    integers: (address, length) => new Int32Array(memory.buffer, address, length),
    bytes: (address, length) => new Uint8Array(memory.buffer, address, length),
  };
}

function decodeBase64(text: string): Uint8Array {
  return Uint8Array.from(atob(text), (character) => character.charCodeAt(0));
}
