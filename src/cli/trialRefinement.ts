import type { Chip } from '../chip/Chip.js';
import { InputError } from '../errors/InputError.js';
import type { Retuning } from '../program/retunings.js';
import { refinedFigure } from '../tolerance/createTrialRetuner.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { judgedFigures } from '../tolerance/thresholds.js';
import type { TrialPlan, TrialRefinement } from '../tolerance/TrialPlan.js';
import { USUAL_ITERATIONS } from '../tolerance/TrialPlan.js';
import type { Console } from './console.js';
import type { PlanResults } from './runPlans.js';
import type { SamplingOptions, TrialOptions } from './trialOptions.js';

/**
 * How trials are refined: for the first threshold, within the iterations and the time of the options. Empty
 * for other retunings.
 * @throws InputError `usage/refine` for limits of a refinement where there is none
 */
export function refinementOf(
  { refineIterations, refineSeconds }: Pick<SamplingOptions, 'refineIterations' | 'refineSeconds'>,
  retune: Retuning,
  chip: Chip,
  thresholds: readonly Threshold[],
): { readonly refine?: TrialRefinement } {
  if (retune !== 'refine') {
    if (refineIterations === undefined && refineSeconds === undefined) return {};
    const given = refineIterations === undefined ? '--refine-seconds' : '--refine-iterations';
    throw new InputError(
      'usage/refine',
      `${given} goes with the retuning refine only`,
      'Give --retune refine too.',
    );
  }
  return {
    refine: {
      figure: refinedFigure(chip, thresholds[0]?.key ?? 'fidelity'),
      mostIterations: refineIterations ?? USUAL_ITERATIONS,
      ...(refineSeconds === undefined ? {} : { mostSeconds: refineSeconds }),
    },
  };
}

/** What all plans of a command that samples chips have in common. */
export function settledPlan(
  options: TrialOptions,
  chip: Chip,
  thresholds: readonly Threshold[],
): Pick<TrialPlan, 'retune' | 'refine' | 'seed' | 'figures'> {
  const { retune, seed } = options;
  const figures = judgedFigures(thresholds);
  return { retune, ...refinementOf(options, retune, chip, thresholds), seed, figures };
}

/** How many trials there were, and how many had their refinement ended by the clock. */
export type TimedTrials = Pick<PlanResults, 'trials' | 'outOfTime'>;

/** The block `refine` of a report; empty for other retunings. */
export function refineBlock(
  refine: TrialRefinement | undefined,
  results: readonly TimedTrials[],
): { readonly refine?: Record<string, unknown> } {
  if (refine === undefined) return {};
  const { figure, mostIterations, mostSeconds } = refine;
  const ran = results.reduce((sum, { outOfTime }) => sum + outOfTime, 0);
  const limit = mostSeconds === undefined ? {} : { mostSeconds, outOfTime: ran, dependsOnMachine: ran > 0 };
  return { refine: { figure, mostIterations, ...limit } };
}

/** Says what a limit of time has done to the results. */
export function tellOutOfTime(
  console: Console,
  refine: TrialRefinement | undefined,
  results: readonly TimedTrials[],
): void {
  if (refine?.mostSeconds === undefined) return;
  const ran = results.reduce((sum, { outOfTime }) => sum + outOfTime, 0);
  const all = results.reduce((sum, { trials }) => sum + trials, 0);
  console.warning(
    `results depend on the machine where --refine-seconds ${refine.mostSeconds} runs out: it did in ${ran} of ${all} trials`,
  );
}
