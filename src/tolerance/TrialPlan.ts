import type { Chip, ProcessErrors } from '../chip/Chip.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Merit } from '../merit/merit.js';
import type { Retuning as AnyRetuning } from '../program/retunings.js';

/**
 * How each sampled chip is programmed. `none`: once, for the chip file as it stands. `cell`: each by the
 * carrying sweep with its own ratios, as if they had been measured.
 */
export const RETUNINGS = ['none', 'cell'] as const satisfies readonly AnyRetuning[];
/** A way to program sampled chips. */
export type Retuning = (typeof RETUNINGS)[number];

/** Everything that decides what the trials are. Plain data that can be sent to a worker. */
export interface TrialPlan {
  readonly chip: Chip;
  /** The target of all trials, or `haar` for a new Haar-random one each. */
  readonly target: ComplexMatrix | 'haar';
  readonly errors: ProcessErrors;
  readonly retune: Retuning;
  /** Whole number from 0 to 2^53 - 1. */
  readonly seed: number;
  /** The figures of merit that are judged, one column of the results each. */
  readonly figures: readonly (keyof Merit)[];
}
