import type { Chip } from '../chip/Chip.js';
import { reachOfChip } from '../chip/reachOfChip.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import { decompose } from '../decompose/decompose.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { judgedFidelity } from '../merit/judgedFidelity.js';
import { simulate } from '../simulate/simulate.js';
import type { Program } from './carryingSweep.js';
import { carryingSweep } from './carryingSweep.js';

/**
 * The phases that the nulling with the reach of the chip's cells leads to, where they are better than those
 * of `cellByCell`; null where they are not, and where every cell can do what the plain nulling wants of it.
 * Both are judged on the chip as it is, losses and shifter ranges included, so that a chip never does worse
 * with this program than cell by cell. That is rare but for chips with very few cells out of reach, where both
 * do nearly the same.
 * @param factors of the target, without a reach
 * @param cellByCell what the carrying sweep made of them
 */
export function programThroughMesh(
  chip: Chip,
  target: ComplexMatrix,
  factors: Decomposition,
  cellByCell: Program,
): Program | null {
  const held = decompose(target, chip.mesh, reachOfChip(chip));
  const allInReach = held.cosine.every((cosine, cell) => cosine === factors.cosine[cell]);
  if (allInReach) return null;
  const program = carryingSweep(chip, held);
  const [through, before] = [program, cellByCell].map(({ settings }) =>
    judgedFidelity(chip, target, simulate(chip, settings)),
  );
  return through! > before! ? program : null;
}
