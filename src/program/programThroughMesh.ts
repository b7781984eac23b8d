import type { Chip } from '../chip/Chip.js';
import type { MeshReach } from '../chip/MeshReach.js';
import { besideFactors, reachOfChip } from '../chip/reachOfChip.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import { decompose, decomposeFromFarSide } from '../decompose/decompose.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { judgedFidelity } from '../merit/judgedFidelity.js';
import { simulate } from '../simulate/simulate.js';
import type { Program } from './carryingSweep.js';
import { carryingSweep } from './carryingSweep.js';

/**
 * How often a chip with cells of three splitters is nulled anew from a side. Of the error that one pass
 * leaves (16 ports, splitter angles off by 0.03), two leave 0.83, three 0.78 and four 0.77: measured.
 */
const PASSES = 2;

/**
 * The phases to which the nulling with the reach of the chip's cells leads, from one side of the mesh or from
 * the other, where they are better than those of `cellByCell`; null where they are not, and where every cell
 * can do what the plain nulling wants of it. All are judged on the chip as it is, losses and shifter ranges
 * included, so no chip does worse than cell by cell. Cost of a nulling: twice that of `decompose`; cells of
 * three splitters are nulled by the readable twin of the kernels, PASSES times from either side.
 * @param factors of the target, without a reach
 * @param cellByCell what the carrying sweep made of them
 */
export function programThroughMesh(
  chip: Chip,
  target: ComplexMatrix,
  factors: Decomposition,
  cellByCell: Program,
): Program | null {
  const fidelityOf = ({ settings }: Program): number =>
    judgedFidelity(chip, target, simulate(chip, settings));
  const plain = chip.style.splitters === 2;
  const programs = plain ? fromBothSides(chip, target, factors) : inPasses(chip, target, factors, cellByCell);
  let best: Program | null = null;
  let bestFidelity = programs.length === 0 ? 0 : fidelityOf(cellByCell);
  for (const program of programs) {
    const fidelity = fidelityOf(program);
    if (fidelity > bestFidelity) {
      best = program;
      bestFidelity = fidelity;
    }
  }
  return best;
}

/** None where no factor is out of reach. */
function fromBothSides(chip: Chip, target: ComplexMatrix, factors: Decomposition): Program[] {
  const reach = reachOfChip(chip);
  const held = decompose(target, chip.mesh, reach);
  if (held.cosine.every((cosine, cell) => cosine === factors.cosine[cell])) return [];
  return [held, decomposeFromFarSide(target, chip.mesh, reach)].map((order) => carryingSweep(chip, order));
}

/**
 * The same for cells of three splitters. Their reach depends on the phases that are carried to them, which
 * the sweep knows only when the nulling is done: each nulling holds the cells in reach for the phases of the
 * sweep before, the first one for those of the plain nulling.
 */
function inPasses(
  chip: Chip,
  target: ComplexMatrix,
  factors: Decomposition,
  { outOfReach, outOfRange }: Program,
): Program[] {
  if (outOfReach.length === 0 && outOfRange.length === 0) return [];
  const reach = reachOfChip(chip);
  const nearSide = (within: MeshReach | null): Decomposition =>
    within === null ? factors : decompose(target, chip.mesh, within);
  const farSide = (within: MeshReach | null): Decomposition =>
    decomposeFromFarSide(target, chip.mesh, within);
  return [nearSide, farSide].flatMap((nulled) => {
    const carriedIn = new Float64Array(4 * chip.mesh.cells);
    const programs: Program[] = [carryingSweep(chip, nulled(null), chip.couplingRatios, carriedIn)];
    for (let pass = 0; pass < PASSES; pass++) {
      const within = { ...reach, beside: besideFactors(chip, carriedIn) };
      programs.push(carryingSweep(chip, nulled(within), chip.couplingRatios, carriedIn));
    }
    return programs;
  });
}
