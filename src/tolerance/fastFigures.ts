import type { Merit } from '../merit/merit.js';
import { decibelFromPowerRatio } from '../units/decibel.js';

/** Figures that follow from the trace, the power and the port overlaps; for all others V itself is needed. */
export const FAST_FIGURES: ReadonlySet<keyof Merit> = new Set<keyof Merit>([
  'fidelity',
  'averageGateFidelity',
  'portPhaseFreeFidelity',
  'rmsError',
  'transmission',
  'transmissionDb',
]);

/**
 * A figure of merit from what the kernels sum up.
 * @param overlapSquare abs(Tr(U^dag V))^2
 * @param power Tr(V^dag V)
 * @param portSum sum over the outputs of abs((V U^dag)_ii)
 */
export function fastFigure(
  key: keyof Merit,
  modes: number,
  overlapSquare: number,
  power: number,
  portSum: number,
): number {
  const fidelity = power > 0 ? overlapSquare / (modes * power) : 0;
  switch (key) {
    case 'averageGateFidelity':
      return (modes * fidelity + 1) / (modes + 1);
    case 'portPhaseFreeFidelity':
      return power > 0 ? portSum ** 2 / (modes * power) : 0;
    case 'rmsError':
      return Math.sqrt(Math.max(0, (modes + power - 2 * Math.sqrt(overlapSquare)) / modes));
    case 'transmission':
      return power / modes;
    case 'transmissionDb':
      return decibelFromPowerRatio(power / modes);
    default:
      return fidelity;
  }
}
