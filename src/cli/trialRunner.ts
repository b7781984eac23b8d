import type { TrialEngine } from '../tolerance/createTrialEngine.js';
import { createTrialEngine } from '../tolerance/createTrialEngine.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';

/** Trials of one plan. */
export interface TrialJob {
  /** Index of the plan. */
  readonly plan: number;
  /** Chunk number over all plans, from 1. */
  readonly number: number;
  /** Index of the first trial, from 0. */
  readonly first: number;
  readonly count: number;
}

export interface TrialChunk {
  readonly rows: Float64Array;
  readonly clamped: number;
  /** Trials whose refinement was ended by the clock. */
  readonly outOfTime: number;
}

/** What runs the trials of plans, which come one after another: an engine is kept until the next one begins. */
export function trialRunner(plans: readonly TrialPlan[]): (job: TrialJob) => TrialChunk {
  let current: { readonly index: number; readonly engine: TrialEngine } | undefined;
  return ({ plan: index, first, count }) => {
    const plan = plans[index]!;
    if (current?.index !== index) current = { index, engine: createTrialEngine(plan) };
    const rows = new Float64Array(count * plan.figures.length);
    const clamped = current.engine.run(first, count, rows);
    return { rows, clamped, outOfTime: current.engine.outOfTime() };
  };
}
