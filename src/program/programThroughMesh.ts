import type { Chip } from '../chip/Chip.js';
import { reachOfChip } from '../chip/reachOfChip.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import { decompose, decomposeFromFarSide } from '../decompose/decompose.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { judgedFidelity } from '../merit/judgedFidelity.js';
import { simulate } from '../simulate/simulate.js';
import type { Program } from './carryingSweep.js';
import { carryingSweep } from './carryingSweep.js';

/**
 * The phases to which the nulling with the reach of the chip's cells leads, from one side of the mesh or from
 * the other, where they are better than those of `cellByCell`; null where they are not, and where every cell
 * can do what the plain nulling wants of it. All are judged on the chip as it is, losses and shifter ranges
 * included, so no chip does worse than cell by cell. Cost of a nulling: twice that of `decompose`.
 * @param factors of the target, without a reach
 * @param cellByCell what the carrying sweep made of them
 */
export function programThroughMesh(
  chip: Chip,
  target: ComplexMatrix,
  factors: Decomposition,
  cellByCell: Program,
): Program | null {
  if (chip.style.splitters !== 2) return null;
  const reach = reachOfChip(chip);
  const held = decompose(target, chip.mesh, reach);
  if (held.cosine.every((cosine, cell) => cosine === factors.cosine[cell])) return null;
  const fidelityOf = ({ settings }: Program): number =>
    judgedFidelity(chip, target, simulate(chip, settings));
  let best: Program | null = null;
  let bestFidelity = fidelityOf(cellByCell);
  for (const order of [held, decomposeFromFarSide(target, chip.mesh, reach)]) {
    const program = carryingSweep(chip, order);
    const fidelity = fidelityOf(program);
    if (fidelity > bestFidelity) {
      best = program;
      bestFidelity = fidelity;
    }
  }
  return best;
}
