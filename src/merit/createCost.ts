import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { PortSide } from './portPhaseFree.js';

/** The figures of merit that a refinement can be for. */
export const COST_FIGURES = ['fidelity', 'portPhaseFreeFidelity', 'powerDistance'] as const;
/** A figure of merit that a refinement can be for. */
export type CostFigure = (typeof COST_FIGURES)[number];

/** What a refinement makes small. Plain readonly data. */
export interface CostDescription {
  readonly figure: CostFigure;
  /** Where the phases are free in the port-phase-free fidelity; the outputs by default. */
  readonly freePorts?: PortSide;
  /** Indices (from 0) of the input ports that are used, each once; all by default. */
  readonly inputs?: readonly number[];
  /** Indices (from 0) of the output ports where the light is wanted, each once; all by default. */
  readonly outputs?: readonly number[];
}

/** A smooth cost of the transfer matrix of some inputs; 0 is perfect. */
export interface Cost {
  readonly inputs: readonly number[];
  readonly outputs: readonly number[];
  /**
   * The cost of a chip.
   * @param achieved the columns of V of the inputs, in their order; all rows
   * @param slope written: the derivatives G by V, d cost = sum of Re(conj(G_ij) dV_ij)
   */
  evaluate(achieved: ComplexMatrix, slope: ComplexMatrix): number;
  /** The figure of merit itself: a fidelity of 1 or a power distance of 0 is perfect. */
  figure(achieved: ComplexMatrix): number;
}

/**
 * The cost that belongs to a figure of merit, on chosen ports or all.
 *
 * With U_s the target's rows and columns of the chosen ports, V_s those of the chip, and V_c all rows of the
 * chip's chosen columns,
 *
 *     fidelity                abs(Tr(U_s^dag V_s))^2 / (Tr(U_s^dag U_s) Tr(V_c^dag V_c))
 *     port-phase-free         the same, maximised over phases of the outputs (or of the inputs)
 *     power distance          mean over chosen inputs of half the sum over outputs of abs(q_ij - p_ij)
 *
 * so that light which leaves by an output that was not chosen is light lost, as far as the figure goes: 1 is
 * attained when all the light of the chosen inputs arrives at the chosen outputs and is there as in the target.
 * q is the target's powers at the chosen outputs, normalised per input, and 0 at the others; p the chip's
 * powers at all outputs, normalised per input. With all ports these are the figures of conventions section 6.
 *
 * The costs are 1 - fidelity, in a form without cancellation (norm_F(V_c - W)^2 / norm_F(V_c)^2 with W the
 * nearest multiple of the target, whose phases are free where they may be), and for the power distance its
 * smooth form: sqrt(x^2 + e^2) - e in place of abs(x), e = {@link POWER_SMOOTHING} divided by the number of
 * outputs, which is below the power distance by at most half of POWER_SMOOTHING.
 *
 * @param target U, N x N
 * @throws InputError `merit/none-wanted` when the target sends no light from the chosen inputs to the chosen
 * outputs; RangeError for ports that do not exist or are named twice
 */
export function createCost(target: ComplexMatrix, description: CostDescription): Cost {
  const ports = {
    inputs: chosenPorts(description.inputs, target.columns),
    outputs: chosenPorts(description.outputs, target.rows),
  };
  const wanted = wantedPart(target, ports);
  const parts =
    description.figure === 'powerDistance'
      ? powerCost(wanted, ports)
      : fidelityCost(wanted, description.figure === 'fidelity' ? null : (description.freePorts ?? 'output'));
  return { ...ports, ...parts };
}

/** Share of a photon, spread over all outputs, below which differences of power are taken squared. */
export const POWER_SMOOTHING = 1e-3;

interface ChosenPorts {
  readonly inputs: readonly number[];
  readonly outputs: readonly number[];
}

type CostFunctions = Pick<Cost, 'evaluate' | 'figure'>;

/** The chosen columns of the target; rows of outputs that were not chosen are 0. */
function wantedPart(
  { rows, columns, re, im }: ComplexMatrix,
  { inputs, outputs }: ChosenPorts,
): ComplexMatrix {
  const size = rows * inputs.length;
  const wanted = { rows, columns: inputs.length, re: new Float64Array(size), im: new Float64Array(size) };
  for (const row of outputs) {
    inputs.forEach((input, k) => {
      wanted.re[row * inputs.length + k] = re[row * columns + input]!;
      wanted.im[row * inputs.length + k] = im[row * columns + input]!;
    });
  }
  return wanted;
}

/** @param free null when no phase but the global one is free */
function fidelityCost(wanted: ComplexMatrix, free: PortSide | null): CostFunctions {
  const { rows, columns, re: wantedRe, im: wantedIm } = wanted;
  const wantedPower = squaredNorm(wanted);
  if (!(wantedPower > 0)) throw noneWanted('the chosen inputs');
  // Entries of one group share a phase: all of them, or those of a row, or those of a column.
  const groups = free === null ? 1 : free === 'output' ? rows : columns;
  const byRow = free === 'output' ? 2 : 0;
  const byColumn = free === 'input' ? 2 : 0;
  const overlaps = new Float64Array(2 * groups);

  /** Writes the overlaps of all groups; returns the sum of their lengths. */
  function overlap(achieved: ComplexMatrix): number {
    const { re, im } = achieved;
    overlaps.fill(0);
    for (let row = 0, k = 0; row < rows; row++) {
      for (let column = 0; column < columns; column++, k++) {
        const at = byRow * row + byColumn * column;
        const ur = wantedRe[k]!;
        const ui = wantedIm[k]!;
        const vr = re[k]!;
        const vi = im[k]!;
        overlaps[at]! += ur * vr + ui * vi;
        overlaps[at + 1]! += ur * vi - ui * vr;
      }
    }
    let sum = 0;
    for (let at = 0; at < 2 * groups; at += 2) sum += Math.hypot(overlaps[at]!, overlaps[at + 1]!);
    return sum;
  }

  /** Writes V - W into `rest` and returns its squared norm; the overlaps hold the factors of the groups in W. */
  function missedBy(achieved: ComplexMatrix, rest: ComplexMatrix): number {
    const { re, im } = achieved;
    const { re: restRe, im: restIm } = rest;
    let missed = 0;
    for (let row = 0, k = 0; row < rows; row++) {
      for (let column = 0; column < columns; column++, k++) {
        const at = byRow * row + byColumn * column;
        const fr = overlaps[at]!;
        const fi = overlaps[at + 1]!;
        const ur = wantedRe[k]!;
        const ui = wantedIm[k]!;
        const x = re[k]! - (fr * ur - fi * ui);
        const y = im[k]! - (fr * ui + fi * ur);
        missed += x * x + y * y;
        restRe[k] = x;
        restIm[k] = y;
      }
    }
    return missed;
  }

  return {
    evaluate: (achieved, slope) => {
      const power = squaredNorm(achieved);
      if (!(power > 0)) {
        slope.re.fill(0);
        slope.im.fill(0);
        return power === 0 ? 1 : NaN;
      }
      const scale = overlap(achieved) / wantedPower;
      // The factor of each group in W: its phase, and the one length of all.
      for (let at = 0; at < 2 * groups; at += 2) {
        const length = Math.hypot(overlaps[at]!, overlaps[at + 1]!);
        overlaps[at] = length > 0 ? (scale * overlaps[at]!) / length : scale;
        overlaps[at + 1] = length > 0 ? (scale * overlaps[at + 1]!) / length : 0;
      }
      const cost = missedBy(achieved, slope) / power;
      // W is the best of its kind, so to first order only V itself moves.
      scaledDifferenceInPlace(slope.re, cost, achieved.re, 2 / power);
      scaledDifferenceInPlace(slope.im, cost, achieved.im, 2 / power);
      return cost;
    },
    figure: (achieved) => {
      const power = squaredNorm(achieved);
      return power === 0 ? 0 : overlap(achieved) ** 2 / (wantedPower * power);
    },
  };
}

function powerCost(wanted: ComplexMatrix, { inputs }: ChosenPorts): CostFunctions {
  const { rows, columns } = wanted;
  const shares = powers(wanted);
  for (let column = 0; column < columns; column++) {
    const sum = columnSum(shares, column, columns);
    if (!(sum > 0)) throw noneWanted(`input ${inputs[column]! + 1}`);
    for (let k = column; k < shares.length; k += columns) shares[k]! /= sum;
  }
  const smoothing = POWER_SMOOTHING / rows;
  return {
    evaluate: (achieved, slope) => {
      const arriving = powers(achieved);
      let cost = 0;
      for (let column = 0; column < columns; column++) {
        const sum = columnSum(arriving, column, columns);
        if (sum === 0) cost += 1;
        let meanSlope = 0;
        for (let k = column; k < arriving.length; k += columns) {
          const share = sum === 0 ? 0 : arriving[k]! / sum;
          const excess = share - shares[k]!;
          const length = Math.sqrt(excess * excess + smoothing * smoothing);
          // The same as length - smoothing, without cancellation.
          if (sum !== 0) cost += (excess * excess) / (length + smoothing) / 2;
          slope.re[k] = sum === 0 ? 0 : excess / length / 2;
          meanSlope += slope.re[k]! * share;
        }
        // A share falls when any power of its input rises: d p = (d P - p d sum)/sum.
        for (let k = column; k < arriving.length; k += columns) {
          const byPower = sum === 0 ? 0 : (slope.re[k]! - meanSlope) / (sum * columns);
          slope.re[k] = 2 * byPower * achieved.re[k]!;
          slope.im[k] = 2 * byPower * achieved.im[k]!;
        }
      }
      return cost / columns;
    },
    figure: (achieved) => {
      const arriving = powers(achieved);
      let total = 0;
      for (let column = 0; column < columns; column++) {
        const sum = columnSum(arriving, column, columns);
        let distance = 0;
        for (let k = column; k < arriving.length; k += columns) {
          distance += Math.abs(shares[k]! - arriving[k]! / sum);
        }
        total += sum === 0 ? 1 : distance / 2;
      }
      return total / columns;
    },
  };
}

/** a = factor (a - share b), entry by entry. */
function scaledDifferenceInPlace(a: Float64Array, share: number, b: Float64Array, factor: number): void {
  for (let k = 0; k < a.length; k++) a[k] = factor * (a[k]! - share * b[k]!);
}

function powers({ re, im }: ComplexMatrix): Float64Array {
  const result = new Float64Array(re.length);
  for (let k = 0; k < re.length; k++) result[k] = re[k]! * re[k]! + im[k]! * im[k]!;
  return result;
}

function columnSum(values: Float64Array, column: number, columns: number): number {
  let sum = 0;
  for (let k = column; k < values.length; k += columns) sum += values[k]!;
  return sum;
}

function squaredNorm({ re, im }: ComplexMatrix): number {
  let sum = 0;
  for (let k = 0; k < re.length; k++) sum += re[k]! * re[k]! + im[k]! * im[k]!;
  return sum;
}

function chosenPorts(chosen: readonly number[] | undefined, count: number): readonly number[] {
  if (chosen === undefined) return Array.from({ length: count }, (_, port) => port);
  const sound = chosen.every((port) => Number.isInteger(port) && port >= 0 && port < count);
  if (!sound || chosen.length === 0 || new Set(chosen).size !== chosen.length) {
    throw new RangeError(
      `ports must be different indices below ${count}, at least one, not ${chosen.join()}`,
    );
  }
  return chosen.toSorted((a, b) => a - b);
}

function noneWanted(from: string): InputError {
  return new InputError(
    'merit/none-wanted',
    `the target sends no light from ${from} to the chosen outputs`,
    'Choose outputs to which the target sends light of every chosen input.',
  );
}
