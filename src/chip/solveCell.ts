import { wrapTurn } from '../units/angle.js';
import { writeArms, writeSplitArms } from './cellTransfer.js';
import type { CellStyle, PhaseRange } from './Chip.js';
import { externalAtOutput } from './Chip.js';
import { cosineOfSum, sineOfDifference } from './reach.js';
import { turnIntoRange } from './turns.js';

/** What a cell is asked to do and what it is built of. */
export interface CellRequest {
  /**
   * W diag(e^{i d}) (external phase at the input) or diag(e^{i d}) W (at the output): 8 numbers, entry 11 re,
   * im, 12, 21, 22.
   */
  readonly wanted: Float64Array;
  firstRatio: number;
  secondRatio: number;
  internalRange: PhaseRange | null;
  externalRange: PhaseRange | null;
}

/** The phases found, and the port phases to carry on. Overwritten by each solution. */
export interface CellSolution {
  internal: number;
  external: number;
  /**
   * The phases that would be set without a range; equal to those above modulo whole turns or the second
   * branch when nothing was clamped.
   */
  internalWanted: number;
  externalWanted: number;
  internalClamped: boolean;
  externalClamped: boolean;
  /** e^{i d'} of the upper and the lower port: 4 numbers. */
  readonly carried: Float64Array;
}

/** Finds the phases of one cell after another; see {@link createCellSolver}. */
export type CellSolver = (request: CellRequest) => CellSolution;

/**
 * How well a candidate does: Re Tr(wanted^dagger achieved), at most 2; differences below this are rounding.
 */
const SAME_SCORE = 1e-12;

/**
 * A solver for the cells of one style: the theta, phi and new port phases d' of
 *
 *     W diag(e^{i d}) = diag(e^{i d'}) T(theta, phi)        external phase at the input
 *     diag(e^{i d}) W = T(theta, phi) diag(e^{i d'})        external phase at the output
 *
 * with T made of the cell's own splitters. One mechanism for ideal cells, for every style and for measured
 * ratios (Bandyopadhyay, Hamerly, Englund, Optica 8, 1247 (2021)); the formulas are those of section 5 of the
 * project's conventions:
 *
 *     sin^2(theta/2) : cos^2(theta/2) = |W11|^2 - cos^2(a+b) : |W12|^2 - sin^2(a-b)     (exchanged for real splitters)
 *
 * Where the cell cannot reach |W11|^2 the nearest end of its reach is taken; phi and d' then maximise the
 * overlap abs Tr(wanted^dagger achieved). In a full bar or cross state phi is 0. theta lies in [0, pi], phi
 * in [0, 2 pi), unless a range asks for the second branch 2 pi - theta, for whole turns or for clamping: all
 * of them are chosen before d' is computed.
 *
 * The solver reuses its solution object: read it before the next call. It allocates nothing when called.
 *
 * @param snap phases nearer than this to a whole turn are 0
 */
export function createCellSolver(style: CellStyle, snap: number): CellSolver {
  const atOutput = externalAtOutput(style);
  const onLower = style.external.startsWith('lower');
  const arms = new Float64Array(4);
  const transfer = new Float64Array(8);
  // overlap[..] = wanted_ij conj(T_ij): its argument is what the phases phi and d' must make good.
  const overlap = new Float64Array(8);
  const carried = new Float64Array(4);
  const solution: CellSolution = {
    internal: 0,
    external: 0,
    internalWanted: 0,
    externalWanted: 0,
    internalClamped: false,
    externalClamped: false,
    carried: new Float64Array(4),
  };

  /**
   * Sets `overlap` for an internal phase. For an external phase at the output rows and columns change places.
   */
  function overlapAt(request: CellRequest, theta: number): void {
    writeArms(arms, style.internal, theta, 1);
    writeSplitArms(transfer, style.splitterForm, request.firstRatio, request.secondRatio, arms);
    for (let entry = 0; entry < 4; entry++) {
      const to = 2 * (atOutput && (entry === 1 || entry === 2) ? 3 - entry : entry);
      const wr = request.wanted[2 * entry]!;
      const wi = request.wanted[2 * entry + 1]!;
      const tr = transfer[2 * entry]!;
      const ti = transfer[2 * entry + 1]!;
      overlap[to] = wr * tr + wi * ti;
      overlap[to + 1] = wi * tr - wr * ti;
    }
  }

  /**
   * The external phase that brings both rows of the overlap into line, in [0, 2 pi); 0 when it does not
   * matter.
   */
  function externalPhase(): number {
    const re =
      overlap[0]! * overlap[2]! +
      overlap[1]! * overlap[3]! +
      (overlap[4]! * overlap[6]! + overlap[5]! * overlap[7]!);
    const im =
      overlap[1]! * overlap[2]! -
      overlap[0]! * overlap[3]! +
      (overlap[5]! * overlap[6]! - overlap[4]! * overlap[7]!);
    if (re === 0 && im === 0) return 0;
    const phase = Math.atan2(im, re);
    return wrapTurn(onLower ? -phase : phase, snap);
  }

  /** Sets `carried` to the best port phases for an external phase and returns the overlap that they reach. */
  function carryOn(phi: number): number {
    const c = Math.cos(phi);
    const s = Math.sin(phi);
    const withShifter = onLower ? 2 : 0;
    let score = 0;
    for (let port = 0; port < 2; port++) {
      const shifted = 4 * port + withShifter;
      const straight = 4 * port + 2 - withShifter;
      const re = overlap[straight]! + c * overlap[shifted]! + s * overlap[shifted + 1]!;
      const im = overlap[straight + 1]! + c * overlap[shifted + 1]! - s * overlap[shifted]!;
      const length = Math.sqrt(re * re + im * im);
      score += length;
      carried[2 * port] = length > 0 ? re / length : 1;
      carried[2 * port + 1] = length > 0 ? im / length : 0;
    }
    return score;
  }

  function take(
    theta: number,
    phi: number,
    wantedPhi: number,
    thetaClamped: boolean,
    clamped: boolean,
  ): void {
    solution.internal = theta;
    solution.external = phi;
    solution.externalWanted = wantedPhi;
    solution.internalClamped = thetaClamped;
    solution.externalClamped = clamped;
    solution.carried.set(carried);
  }

  return (request) => {
    const theta = internalPhase(request, style.splitterForm === 'real');
    solution.internalWanted = theta;
    const { internalRange, externalRange } = request;
    // In the order of preference: a later candidate must be better, not just as good.
    const inRange = turnIntoRange(theta, internalRange);
    const secondBranch = internalRange === null ? NaN : turnIntoRange(2 * Math.PI - theta, internalRange);
    const clamped = Number.isNaN(inRange) && Number.isNaN(secondBranch);
    let bestScore = -1;
    for (let candidate = 0; candidate < 2; candidate++) {
      const first = candidate === 0;
      const internal = clamped ? internalRange![candidate]! : first ? inRange : secondBranch;
      if (Number.isNaN(internal)) continue;
      overlapAt(request, internal);
      const wantedPhi = externalPhase();
      const external = turnIntoRange(wantedPhi, externalRange);
      if (!Number.isNaN(external)) {
        const score = carryOn(external);
        if (score > bestScore + SAME_SCORE) {
          bestScore = score;
          take(internal, external, wantedPhi, clamped, false);
        }
        continue;
      }
      for (const end of externalRange!) {
        const score = carryOn(end);
        if (score > bestScore + SAME_SCORE) {
          bestScore = score;
          take(internal, end, wantedPhi, clamped, true);
        }
      }
    }
    return solution;
  };
}

/**
 * theta in [0, pi] for |W11|^2, or for the nearest bar power in reach. The differences are taken between
 * amplitudes, where both ends stay accurate.
 */
function internalPhase({ wanted, firstRatio, secondRatio }: CellRequest, realSplitters: boolean): number {
  const divisor = firstRatio * (1 - firstRatio) * secondRatio * (1 - secondRatio);
  if (!(divisor > 0)) return 0;
  const barAmplitude = Math.sqrt(wanted[0]! * wanted[0]! + wanted[1]! * wanted[1]!);
  const crossAmplitude = Math.sqrt(wanted[2]! * wanted[2]! + wanted[3]! * wanted[3]!);
  const leastBar = cosineOfSum(firstRatio, secondRatio);
  const leastCross = sineOfDifference(firstRatio, secondRatio);
  const bar = Math.max(0, (barAmplitude - leastBar) * (barAmplitude + leastBar));
  const cross = Math.max(0, (crossAmplitude - leastCross) * (crossAmplitude + leastCross));
  return realSplitters
    ? 2 * Math.atan2(Math.sqrt(cross), Math.sqrt(bar))
    : 2 * Math.atan2(Math.sqrt(bar), Math.sqrt(cross));
}
