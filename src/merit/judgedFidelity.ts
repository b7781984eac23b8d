import type { Chip } from '../chip/Chip.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { frobeniusNorm } from '../matrix/norms.js';
import { innerProduct } from '../matrix/products.js';
import { freePorts, portPhaseFreeFidelity } from './portPhaseFree.js';

/**
 * The fidelity by which two programs of one chip are compared: abs(Tr(U^dag V))^2 / (N Tr(V^dag V)), and on a
 * chip without port shifters the port-phase-free one, since such a chip cannot set what that leaves out. 0
 * for a V of zeros.
 * @throws RangeError when the shapes differ
 */
export function judgedFidelity(chip: Chip, target: ComplexMatrix, achieved: ComplexMatrix): number {
  if (!chip.portShifters) return portPhaseFreeFidelity(target, achieved, freePorts(chip));
  const [re, im] = innerProduct(target, achieved);
  const power = frobeniusNorm(achieved) ** 2;
  return power === 0 ? 0 : (re * re + im * im) / (target.rows * power);
}
