import { ratiosOfCell } from '../chip/cellSplitters.js';
import { applyOuterSplitterInPlace } from '../chip/cellTransfer.js';
import type { CellStyle, Chip, PhaseRange } from '../chip/Chip.js';
import { externalAtOutput } from '../chip/Chip.js';
import { cellReach, cosineOfSum, sineOfDifference } from '../chip/reach.js';
import type { Settings } from '../chip/Settings.js';
import { shifterIndexOfPort, shifterIndicesOfCell, zeroSettings } from '../chip/shifters.js';
import type { CellRequest, CellSolution } from '../chip/solveCell.js';
import { createCellSolver } from '../chip/solveCell.js';
import { nearestEnd, turnIntoRange } from '../chip/turns.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import { wrapTurn } from '../units/angle.js';

/** A cell that cannot reach the bar power wanted of it and was set to the nearest that it can. */
export interface OutOfReach {
  /** Index (from 0) of the cell. */
  readonly cellIndex: number;
  /** Bar power wanted; of a cell with a third splitter, that wanted of the two around the arms. */
  readonly wanted: number;
  /** Least and greatest bar power that these two splitters can attain. */
  readonly low: number;
  readonly high: number;
}

/** A shifter whose range does not hold the phase wanted of it, whole turns and the second branch included. */
export interface OutOfRange {
  /** Index (from 0) of the shifter in the phase table's order. */
  readonly shifterIndex: number;
  readonly wantedRad: number;
  readonly setRad: number;
}

/** The phases found for a chip, and where the chip cannot do what was wanted. */
export interface Program {
  readonly settings: Settings;
  readonly outOfReach: readonly OutOfReach[];
  readonly outOfRange: readonly OutOfRange[];
  /** Bar power wanted of each cell, in cell order, as in {@link OutOfReach}. */
  readonly wantedBar: Float64Array;
}

/**
 * Rounding allowed in phases and amplitudes, in units of N eps; 3 N eps was the most seen over all styles.
 */
const ROUNDING = 16;

/**
 * Finds the phases of a chip from the factors of a target: one sweep through the mesh, with the light for
 * cells that have the external phase at the input, against it for the others, carrying a diagonal of phases
 * from cell to cell (conventions, section 5). What is left at the end are the phases of the port shifters.
 * A third splitter S(c) of a cell is fixed, and so belongs to what is wanted of the rest of the cell: the
 * solver is asked for W diag(e^{i d}) S(c)^dag, and the reach is judged on that (Hamerly, Bandyopadhyay,
 * Englund, Nat. Commun. 13, 6831 (2022)). Losses are ignored. Cost O(N^2).
 * @param couplingRatios the ratios to reckon with, as many per cell as it has splitters; by default the
 * chip's own
 * @param carriedIn written where given: the carried phases that each cell meets, 4 numbers a cell, the upper
 * port's re and im first
 * @throws RangeError when the decomposition stands on another mesh than the chip's
 */
export function carryingSweep(
  chip: Chip,
  decomposition: Decomposition,
  couplingRatios: Float64Array = chip.couplingRatios,
  carriedIn: Float64Array | null = null,
): Program {
  const { mesh, style } = chip;
  const { modes, cells, upperPortIndex } = mesh;
  requireSameMesh(chip, decomposition);
  const tolerance = ROUNDING * modes * Number.EPSILON;
  const solve = createCellSolver(style, tolerance);
  const againstLight = externalAtOutput(style);
  const settings = zeroSettings(chip);
  const wantedBar = new Float64Array(cells);
  const outOfReach: OutOfReach[] = [];
  const outOfRange: OutOfRange[] = [];
  const carried = createCarriedPhases(decomposition, againstLight);
  const request: CellRequest = {
    wanted: new Float64Array(8),
    firstRatio: 0.5,
    secondRatio: 0.5,
    internalRange: chip.shifterRange,
    externalRange: chip.shifterRange,
  };

  for (let step = 0; step < cells; step++) {
    const cell = againstLight ? cells - 1 - step : step;
    const upper = upperPortIndex[cell]!;
    const shifters = shifterIndicesOfCell(chip, cell);
    carried.meetDiagonal(upper, cell);
    carried.meetDiagonal(upper + 1, cell);
    carriedIn?.set(carried.phases.subarray(2 * upper, 2 * upper + 4), 4 * cell);
    writeWanted(request.wanted, decomposition, cell, carried.phases, upper, againstLight);
    const { first, second, outer } = ratiosOfCell(style, couplingRatios, cell);
    if (outer !== null) undoOuterSplitter(request.wanted, style, outer, tolerance);
    request.firstRatio = first;
    request.secondRatio = second;
    if (chip.shifterRanges.size > 0) {
      request.internalRange = rangeOf(chip, shifters.internal);
      request.externalRange = rangeOf(chip, shifters.external);
    }
    const solution = solve(request);
    settings.internal[cell] = solution.internal;
    settings.external[cell] = solution.external;
    carried.phases.set(solution.carried, 2 * upper);
    wantedBar[cell] = request.wanted[0]! ** 2 + request.wanted[1]! ** 2;
    noteReach(outOfReach, request, cell, tolerance);
    noteRange(outOfRange, solution, shifters, tolerance);
  }
  for (let port = 0; port < modes; port++) {
    carried.meetDiagonal(port, againstLight ? -1 : cells);
    if (settings.port) settings.port[port] = portPhase(chip, carried.phases, port, tolerance, outOfRange);
  }
  outOfReach.sort((a, b) => a.cellIndex - b.cellIndex);
  outOfRange.sort((a, b) => a.shifterIndex - b.shifterIndex);
  return { settings, outOfReach, outOfRange, wantedBar };
}

/**
 * The phase factors on the guides as the sweep goes on: at 2p and 2p + 1 real and imaginary part for port p.
 */
interface CarriedPhases {
  readonly phases: Float64Array;
  /**
   * Takes up the port's phase of the decomposition's diagonal once the sweep, about to treat `cell`, has come
   * to it.
   */
  meetDiagonal(port: number, cell: number): void;
}

function createCarriedPhases(
  { diagonal, diagonalBefore }: Decomposition,
  againstLight: boolean,
): CarriedPhases {
  const phases = Float64Array.from({ length: 2 * diagonal.length }, (_, k) => (k % 2 === 0 ? 1 : 0));
  const met = new Uint8Array(diagonal.length);
  const meetDiagonal = (port: number, cell: number): void => {
    const reached = againstLight ? cell < diagonalBefore[port]! : cell >= diagonalBefore[port]!;
    if (met[port] === 1 || !reached) return;
    met[port] = 1;
    const c = Math.cos(diagonal[port]!);
    const s = Math.sin(diagonal[port]!);
    const re = phases[2 * port]!;
    const im = phases[2 * port + 1]!;
    phases[2 * port] = c * re - s * im;
    phases[2 * port + 1] = c * im + s * re;
  };
  return { phases, meetDiagonal };
}

/** W diag(e^{i d}) with the light, diag(e^{i d}) W against it. */
function writeWanted(
  wanted: Float64Array,
  { cosine, sineRe, sineIm }: Decomposition,
  cell: number,
  phases: Float64Array,
  upper: number,
  againstLight: boolean,
): void {
  const c = cosine[cell]!;
  const sr = sineRe[cell]!;
  const si = sineIm[cell]!;
  for (let row = 0; row < 2; row++) {
    for (let column = 0; column < 2; column++) {
      const wr = row === column ? c : row === 1 ? sr : -sr;
      const wi = row === column ? 0 : si;
      const port = upper + (againstLight ? row : column);
      const re = phases[2 * port]!;
      const im = phases[2 * port + 1]!;
      wanted[4 * row + 2 * column] = wr * re - wi * im;
      wanted[4 * row + 2 * column + 1] = wr * im + wi * re;
    }
  }
}

/**
 * Takes the third splitter out of what is wanted. Bar and cross states of what is left come about by
 * cancellation: entries of rounding noise are set to 0, or phases would be made of it.
 */
function undoOuterSplitter(wanted: Float64Array, style: CellStyle, ratio: number, tolerance: number): void {
  applyOuterSplitterInPlace(wanted, style, ratio, true);
  for (let k = 0; k < 8; k += 2) {
    if (Math.hypot(wanted[k]!, wanted[k + 1]!) <= tolerance) wanted.fill(0, k, k + 2);
  }
}

function noteReach(
  outOfReach: OutOfReach[],
  { wanted, firstRatio, secondRatio }: CellRequest,
  cell: number,
  tolerance: number,
): void {
  const bar = Math.hypot(wanted[0]!, wanted[1]!);
  const cross = Math.hypot(wanted[2]!, wanted[3]!);
  const barMissed = cosineOfSum(firstRatio, secondRatio) - bar > tolerance;
  const crossMissed = sineOfDifference(firstRatio, secondRatio) - cross > tolerance;
  if (barMissed || crossMissed) {
    outOfReach.push({ cellIndex: cell, wanted: bar * bar, ...cellReach(firstRatio, secondRatio) });
  }
}

function noteRange(
  outOfRange: OutOfRange[],
  solution: CellSolution,
  shifters: { readonly external: number; readonly internal: number },
  tolerance: number,
): void {
  // Near 0 and pi rounding in powers grows to its square root in theta: what counts is whether sin^2(theta/2)
  // is missed.
  const { internal, internalWanted } = solution;
  const missed = Math.abs(
    Math.sin((internalWanted - internal) / 2) * Math.sin((internalWanted + internal) / 2),
  );
  if (solution.internalClamped && missed > tolerance) {
    outOfRange.push({
      shifterIndex: shifters.internal,
      wantedRad: internalWanted,
      setRad: internal,
    });
  }
  if (solution.externalClamped) {
    outOfRange.push({
      shifterIndex: shifters.external,
      wantedRad: solution.externalWanted,
      setRad: solution.external,
    });
  }
}

function portPhase(
  chip: Chip,
  phases: Float64Array,
  port: number,
  tolerance: number,
  outOfRange: OutOfRange[],
): number {
  const wantedRad = wrapTurn(Math.atan2(phases[2 * port + 1]!, phases[2 * port]!), tolerance);
  const shifterIndex = shifterIndexOfPort(chip, port);
  const range = rangeOf(chip, shifterIndex);
  const turned = turnIntoRange(wantedRad, range);
  if (!Number.isNaN(turned)) return turned;
  const setRad = nearestEnd(wantedRad, range!);
  outOfRange.push({ shifterIndex, wantedRad, setRad });
  return setRad;
}

function rangeOf(chip: Chip, shifterIndex: number): PhaseRange | null {
  return chip.shifterRanges.get(shifterIndex) ?? chip.shifterRange;
}

function requireSameMesh(chip: Chip, { mesh }: Decomposition): void {
  const own = chip.mesh;
  if (mesh.modes !== own.modes || mesh.layout !== own.layout || mesh.mirror !== own.mirror) {
    throw new RangeError(
      `the factors stand on a ${mesh.layout} mesh of ${mesh.modes} ports (mirror ${mesh.mirror}), ` +
        `the chip is ${own.layout} with ${own.modes} (mirror ${own.mirror})`,
    );
  }
}
