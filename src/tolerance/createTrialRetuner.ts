import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { CostFigure } from '../merit/createCost.js';
import { COST_FIGURES } from '../merit/createCost.js';
import type { Merit } from '../merit/merit.js';
import { judgedFigure } from '../merit/judgedFidelity.js';
import { freePorts } from '../merit/portPhaseFree.js';
import { carryingSweep } from '../program/carryingSweep.js';
import { programThroughMesh } from '../program/programThroughMesh.js';
import { refineSettings } from '../program/refineSettings.js';
import { reserveFieldMemory } from '../simulate/createFieldSweep.js';
import type { TrialPlan } from './TrialPlan.js';
import { USUAL_ITERATIONS } from './TrialPlan.js';

/** What the phases of a sampled chip are, and whether the time for them ran out. */
export interface RetunedTrial {
  readonly settings: Settings;
  /** True when the refinement was ended by the clock. */
  readonly outOfTime: boolean;
}

/**
 * The figure of merit that trials are refined for: what is judged first, where a refinement can be for it,
 * else the fidelity; on chips without port shifters the port-phase-free one in its place, since they cannot
 * set what that leaves out.
 */
export function refinedFigure(chip: Chip, judgedFirst: keyof Merit): CostFigure {
  const figure = COST_FIGURES.find((known) => known === judgedFirst) ?? 'fidelity';
  return figure === 'fidelity' ? judgedFigure(chip) : figure;
}

/**
 * Makes what programs the sampled chips of a plan one by one, by the retunings that look at the whole mesh:
 * `mesh`, and `refine` from there on. Holds a kernel memory of its own.
 * @returns the phases for a chip, a target and the target's factors without a reach
 */
export function createTrialRetuner({
  chip: nominal,
  retune,
  figures,
  refine,
}: TrialPlan): (chip: Chip, target: ComplexMatrix, factors: Decomposition) => RetunedTrial {
  const through = (chip: Chip, target: ComplexMatrix, factors: Decomposition): Settings => {
    const cellByCell = carryingSweep(chip, factors);
    return (programThroughMesh(chip, target, factors, cellByCell) ?? cellByCell).settings;
  };
  if (retune !== 'refine') return (...trial) => ({ settings: through(...trial), outOfTime: false });
  const { modes } = nominal.mesh;
  const fields = reserveFieldMemory(
    nominal.mesh,
    Array.from({ length: modes }, (_, port) => port),
  );
  const figure = refine?.figure ?? refinedFigure(nominal, figures[0] ?? 'fidelity');
  const cost = { figure, freePorts: freePorts(nominal) };
  const options = {
    fields,
    mostIterations: refine?.mostIterations ?? USUAL_ITERATIONS,
    ...(refine?.mostSeconds === undefined ? {} : { mostSeconds: refine.mostSeconds }),
  };
  return (chip, target, factors) => {
    const start = through(chip, target, factors);
    const { settings, stopped } = refineSettings(chip, target, [start], cost, options);
    return { settings, outOfTime: stopped === 'time' };
  };
}
