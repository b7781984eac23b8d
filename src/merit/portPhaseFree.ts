import type { Chip } from '../chip/Chip.js';
import { externalAtOutput } from '../chip/Chip.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { frobeniusNorm } from '../matrix/norms.js';
import { wrapTurn } from '../units/angle.js';

/** The ports whose phases are free: those before the detectors, or those behind the sources. */
export type PortSide = 'output' | 'input';

/**
 * The ports whose phases a chip leaves free: those of the port shifters that it does not have, else the
 * outputs.
 */
export function freePorts(chip: Chip): PortSide {
  return !chip.portShifters && externalAtOutput(chip.style) ? 'input' : 'output';
}

/**
 * Fidelity maximised over the phases of the free ports: (sum_i abs((V U^dag)_ii))^2 / (N Tr(V^dag V)) over
 * the outputs, with U^dag V over the inputs. 0 for a V of zeros.
 */
export function portPhaseFreeFidelity(
  target: ComplexMatrix,
  achieved: ComplexMatrix,
  side: PortSide,
): number {
  const power = frobeniusNorm(achieved) ** 2;
  if (!(power > 0)) return power === 0 ? 0 : NaN;
  const sum = portOverlaps(target, achieved, side).reduce((total, [re, im]) => total + Math.hypot(re, im), 0);
  return sum ** 2 / (target.rows * power);
}

/**
 * The phases in [0, 2 pi) that the free ports would have to add to V to come nearest to U: e^{i phase_i} V_i.
 * = U_i. for an exact V. What a chip without port shifters leaves undone. One per port; 0 where the port's
 * light does not overlap with the target at all.
 */
export function missingPortPhases(
  target: ComplexMatrix,
  achieved: ComplexMatrix,
  side: PortSide,
): Float64Array {
  const snap = 16 * target.rows * Number.EPSILON;
  const overlaps = portOverlaps(target, achieved, side);
  return Float64Array.from(overlaps, ([re, im]) => wrapTurn(-Math.atan2(im, re), snap));
}

/** (V U^dag)_ii for the outputs, (U^dag V)_ii for the inputs. */
function portOverlaps(
  target: ComplexMatrix,
  achieved: ComplexMatrix,
  side: PortSide,
): [re: number, im: number][] {
  const { rows, columns } = target;
  if (achieved.rows !== rows || achieved.columns !== columns) {
    throw new RangeError(`shapes differ: ${rows} x ${columns} and ${achieved.rows} x ${achieved.columns}`);
  }
  const overlaps = Array.from({ length: side === 'output' ? rows : columns }, (): [number, number] => [0, 0]);
  for (let i = 0; i < rows; i++) {
    for (let j = 0; j < columns; j++) {
      const k = i * columns + j;
      const ur = target.re[k]!;
      const ui = target.im[k]!;
      const vr = achieved.re[k]!;
      const vi = achieved.im[k]!;
      const sum = overlaps[side === 'output' ? i : j]!;
      sum[0] += ur * vr + ui * vi;
      sum[1] += ur * vi - ui * vr;
    }
  }
  return overlaps;
}
