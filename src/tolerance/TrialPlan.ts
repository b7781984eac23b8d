import type { Chip, ProcessErrors } from '../chip/Chip.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { CostFigure } from '../merit/createCost.js';
import type { Merit } from '../merit/merit.js';
import type { Retuning } from '../program/retunings.js';

/** How the phases of each trial are refined, and for how long at most. */
export interface TrialRefinement {
  /** The figure of merit that is made as good as can be. */
  readonly figure: CostFigure;
  readonly mostIterations: number;
  /**
   * Time for each trial in seconds; no limit when absent. With a limit the results depend on the machine
   * wherever a trial runs into it.
   */
  readonly mostSeconds?: number;
}

/** Everything that decides what the trials are. Plain data that can be sent to a worker. */
export interface TrialPlan {
  readonly chip: Chip;
  /** The target of all trials, or `haar` for a new Haar-random one each. */
  readonly target: ComplexMatrix | 'haar';
  readonly errors: ProcessErrors;
  /**
   * How each sampled chip is programmed. With `none` once, for the chip file as it stands; else each with its
   * own ratios and losses, as if they had been measured. Errors and resolution of the phases come on top of
   * that.
   */
  readonly retune: Retuning;
  /** For `refine`; by default the figure that `refinedFigure` names and {@link USUAL_ITERATIONS}. */
  readonly refine?: TrialRefinement;
  /** Whole number from 0 to 2^53 - 1. */
  readonly seed: number;
  /** The figures of merit that are judged, one column of the results each. */
  readonly figures: readonly (keyof Merit)[];
}

/**
 * Iterations of a trial's refinement when nothing else is asked for. With Haar targets and sigma 0.03, 200
 * leave what any number would at N = 8, a sixth more than 1000 at N = 16, and some 40 % more than 400 at
 * N = 32 (measured on a few chips).
 */
export const USUAL_ITERATIONS = 200;
