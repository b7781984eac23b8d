import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { frobeniusNorm } from '../matrix/norms.js';
import { innerProduct, subtract, turnPhase } from '../matrix/products.js';
import { spectralNorm } from '../matrix/spectralNorm.js';
import { decibelFromPowerRatio } from '../units/decibel.js';
import type { PortSide } from './portPhaseFree.js';
import { portPhaseFreeFidelity } from './portPhaseFree.js';
import { powerDistance } from './powerDistance.js';

/** How well a chip's transfer matrix V does a target U; the formulas are those of conventions section 6. */
export interface Merit {
  /** abs(Tr(U^dag V))^2 / (N Tr(V^dag V)), blind to a global phase and to uniform loss; 1 is perfect. */
  readonly fidelity: number;
  /**
   * (N F + 1)/(N + 1): Horodecki et al., Phys. Rev. A 60, 1888 (1999); Nielsen, Phys. Lett. A 303, 249
   * (2002).
   */
  readonly averageGateFidelity: number;
  /** Fidelity at the best phases of the free ports. */
  readonly portPhaseFreeFidelity: number;
  /** norm_F(U - e^{ig} V)/sqrt(N) at the best global phase g. */
  readonly rmsError: number;
  /** Spectral norm of U - e^{ig} V at the same g. */
  readonly worstCaseError: number;
  /**
   * Mean over inputs of the total variation between output powers, normalised per input; blind to all phases
   * and to loss.
   */
  readonly powerDistance: number;
  /** Tr(V^dag V)/N: the power that arrives, averaged over inputs. */
  readonly transmission: number;
  readonly transmissionDb: number;
}

/** The keys of {@link Merit}, in the order of reports. */
export const MERIT_KEYS = [
  'fidelity',
  'averageGateFidelity',
  'portPhaseFreeFidelity',
  'rmsError',
  'worstCaseError',
  'powerDistance',
  'transmission',
  'transmissionDb',
] as const satisfies readonly (keyof Merit)[];

/** True for figures that are errors: less is better, and a requirement on them is an upper limit. */
export function isUpperLimit(key: keyof Merit): boolean {
  return key === 'rmsError' || key === 'worstCaseError' || key === 'powerDistance';
}

/**
 * All figures of merit of what a chip does against its target.
 * @param target U, N x N unitary
 * @param achieved V, N x N, lossy or not
 * @param freePorts where the phases are free in the port-phase-free fidelity
 * @throws RangeError when the shapes differ. A V of zeros has no fidelity: its figures are 0, its errors
 * those of darkness.
 */
export function figuresOfMerit(
  target: ComplexMatrix,
  achieved: ComplexMatrix,
  freePorts: PortSide = 'output',
): Merit {
  const modes = target.rows;
  const [traceRe, traceIm] = innerProduct(target, achieved);
  const overlap = Math.hypot(traceRe, traceIm);
  const power = frobeniusNorm(achieved) ** 2;
  const fidelity = power > 0 ? overlap ** 2 / (modes * power) : 0;
  // A trace of rounding noise has no phase.
  const vanishes = overlap <= modes * Number.EPSILON * Math.sqrt(modes * power);
  const globalPhase = vanishes ? 0 : -Math.atan2(traceIm, traceRe);
  const error = subtract(target, turnPhase(achieved, globalPhase));
  const transmission = power / modes;
  return {
    fidelity,
    averageGateFidelity: (modes * fidelity + 1) / (modes + 1),
    portPhaseFreeFidelity: portPhaseFreeFidelity(target, achieved, freePorts),
    rmsError: frobeniusNorm(error) / Math.sqrt(modes),
    worstCaseError: spectralNorm(error),
    powerDistance: powerDistance(target, achieved),
    transmission,
    transmissionDb: decibelFromPowerRatio(transmission),
  };
}
