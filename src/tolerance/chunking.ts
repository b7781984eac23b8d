import type { TrialPlan } from './TrialPlan.js';

/**
 * Rough cost of a trial in microseconds, for the size of chunks only: two terms, cells and their propagation.
 */
function trialCost({ chip, target, retune }: TrialPlan): number {
  const { modes } = chip.mesh;
  const plain = 0.5 + 0.02 * modes ** 2 + 0.0005 * modes ** 3;
  const programmed = target === 'haar' ? 5 + 0.1 * modes ** 2 + 0.002 * modes ** 3 : 0;
  return (retune === 'cell' ? 2 : 1) * plain + programmed;
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
