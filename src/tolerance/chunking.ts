import type { TrialPlan } from './TrialPlan.js';
import { USUAL_ITERATIONS } from './TrialPlan.js';

/**
 * Rough cost of a trial in microseconds, for the size of chunks and usual numbers of trials only: two terms,
 * cells and their propagation; of a refinement what all its iterations take.
 */
export function trialCost({ chip, target, retune, refine }: TrialPlan): number {
  const { modes } = chip.mesh;
  const plain = 0.5 + 0.02 * modes ** 2 + 0.0005 * modes ** 3;
  const programmed = target === 'haar' ? 5 + 0.1 * modes ** 2 + 0.002 * modes ** 3 : 0;
  if (retune === 'none' || retune === 'cell') return (retune === 'cell' ? 2 : 1) * plain + programmed;
  const throughMesh = 30 + 2 * modes ** 2 + 0.03 * modes ** 3;
  const iterations = retune === 'refine' ? (refine?.mostIterations ?? USUAL_ITERATIONS) : 0;
  return plain + programmed + throughMesh + 0.015 * iterations * modes ** 3;
}

/** About so long shall a chunk take, so that handing it out costs nothing. */
const CHUNK_MICROSECONDS = 40_000;

/**
 * Trials in a chunk: the same for every number of workers, or the chunks on disk could not be taken up with
 * another one. Always even, since trials run in pairs.
 */
export function chunkTrials(plan: TrialPlan): number {
  const wanted = CHUNK_MICROSECONDS / trialCost(plan);
  return 2 * Math.min(8192, Math.max(1, Math.round(wanted / 2)));
}
