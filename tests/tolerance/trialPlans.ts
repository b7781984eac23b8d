import type { ProcessErrors } from '../../src/chip/Chip.js';
import { NO_ERRORS } from '../../src/chip/Chip.js';
import type { IdealChipOptions } from '../../src/chip/idealChip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { createTrialEngine } from '../../src/tolerance/createTrialEngine.js';
import type { TrialPlan } from '../../src/tolerance/TrialPlan.js';

/** A plan on an ideal chip: fidelity of a fixed Haar target, phases programmed once. */
export function planFor(
  modes: number,
  errors: Partial<ProcessErrors>,
  others: Partial<TrialPlan> = {},
  options: IdealChipOptions = {},
): TrialPlan {
  return {
    chip: idealChip(modes, options),
    target: haarUnitary(modes, 1),
    errors: { ...NO_ERRORS, ...errors },
    retune: 'none',
    seed: 20_240_229,
    figures: ['fidelity'],
    ...others,
  };
}

/** Mean, standard error and standard deviation of numbers. */
export interface Sample {
  readonly mean: number;
  readonly standardError: number;
  readonly deviation: number;
}

export function sampleOf(values: ArrayLike<number>): Sample {
  const count = values.length;
  let sum = 0;
  for (let k = 0; k < count; k++) sum += values[k]!;
  const mean = sum / count;
  let squares = 0;
  for (let k = 0; k < count; k++) squares += (values[k]! - mean) ** 2;
  const deviation = Math.sqrt(squares / (count - 1));
  return { mean, deviation, standardError: deviation / Math.sqrt(count) };
}

/** The judged figures of the first trials of a plan. */
export function runPlan(plan: TrialPlan, trials: number): { rows: Float64Array; clamped: number } {
  const rows = new Float64Array(trials * plan.figures.length);
  const clamped = createTrialEngine(plan).run(0, trials, rows);
  return { rows, clamped };
}

/** 1 - F of the first trials of a plan that judges fidelity alone. */
export function infidelities(plan: TrialPlan, trials: number): Sample {
  return sampleOf(runPlan(plan, trials).rows.map((fidelity) => 1 - fidelity));
}
