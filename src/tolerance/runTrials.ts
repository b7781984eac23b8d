import { chunkTrials } from './chunking.js';
import { createTrialEngine } from './createTrialEngine.js';
import type { TrialPlan } from './TrialPlan.js';

/** What trials gave. */
export interface TrialResults {
  /** One row per trial in trial order, one column per judged figure. */
  readonly rows: Float64Array;
  /** Coupling ratios that were clamped to [0, 1]. */
  readonly clamped: number;
  /** Trials whose refinement was ended by the clock. */
  readonly outOfTime: number;
}

/** How trials are run. */
export interface RunTrialsOptions {
  readonly signal?: AbortSignal;
  /** Called after each chunk with the number of trials done. */
  readonly onProgress?: (done: number) => void;
}

/**
 * Runs the first `trials` trials of a plan in this thread. The rows are the same bits as with any number of
 * workers, unless a refinement runs into a limit of time.
 * @throws the signal's reason when it is aborted
 */
export async function runTrials(
  plan: TrialPlan,
  trials: number,
  { signal, onProgress }: RunTrialsOptions = {},
): Promise<TrialResults> {
  const engine = createTrialEngine(plan);
  const columns = plan.figures.length;
  const rows = new Float64Array(trials * columns);
  const size = chunkTrials(plan);
  let clamped = 0;
  let outOfTime = 0;
  for (let first = 0; first < trials; first += size) {
    signal?.throwIfAborted();
    const count = Math.min(size, trials - first);
    clamped += engine.run(first, count, rows.subarray(first * columns, (first + count) * columns));
    outOfTime += engine.outOfTime();
    onProgress?.(first + count);
    // Lets timers and signals in.
    await new Promise((resolve) => setTimeout(resolve, 0));
  }
  return { rows, clamped, outOfTime };
}
