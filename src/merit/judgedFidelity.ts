import type { Chip } from '../chip/Chip.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { frobeniusNorm } from '../matrix/norms.js';
import { innerProduct } from '../matrix/products.js';
import { freePorts, portPhaseFreeFidelity } from './portPhaseFree.js';

/**
 * The figure of merit by which a chip is judged when nothing else is asked for: the fidelity, without port
 * shifters the port-phase-free one, since such a chip cannot set what that leaves out.
 */
export function judgedFigure(chip: Chip): 'fidelity' | 'portPhaseFreeFidelity' {
  return chip.portShifters ? 'fidelity' : 'portPhaseFreeFidelity';
}

/**
 * The fidelity by which two programs of one chip are compared: abs(Tr(U^dag V))^2 / (N Tr(V^dag V)), and on a
 * chip without port shifters the port-phase-free one, since such a chip cannot set what that leaves out. 0
 * for a V of zeros.
 * @throws RangeError when the shapes differ
 */
export function judgedFidelity(chip: Chip, target: ComplexMatrix, achieved: ComplexMatrix): number {
  if (judgedFigure(chip) === 'portPhaseFreeFidelity')
    return portPhaseFreeFidelity(target, achieved, freePorts(chip));
  const [re, im] = innerProduct(target, achieved);
  const power = frobeniusNorm(achieved) ** 2;
  return power === 0 ? 0 : (re * re + im * im) / (target.rows * power);
}
