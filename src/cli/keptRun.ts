import type { ProcessErrors } from '../chip/Chip.js';
import { openChunkStore } from '../files/chunkStore.js';
import { sensibleWorkers } from '../files/sensibleWorkers.js';
import { INTERRUPTED, withInterrupt } from '../files/withInterrupt.js';
import { requireNoOtherRun } from '../files/writeResults.js';
import type { Threshold } from '../tolerance/thresholds.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import type { Console } from './console.js';
import type { PlanOutcome, PlanResults } from './runPlans.js';
import { runPlans } from './runPlans.js';
import type { Scenario } from './trialScenario.js';

/** A run of trials whose finished chunks are kept until its results are written. */
export interface KeptRun {
  readonly console: Console;
  readonly options: {
    readonly trials: number;
    readonly workers?: number;
    readonly resume?: boolean;
    readonly force?: boolean;
  };
  readonly folder: string;
  readonly runId: string;
  /** Names of the results, besides the report. */
  readonly files: readonly string[];
  /** Inputs and options, so that a refused resume can say what has changed. */
  readonly description: unknown;
  readonly plans: readonly TrialPlan[];
  /** Judged after each chunk; true ends the run. */
  readonly enough?: (results: PlanResults) => boolean;
  /** False when a part of the trials is not worth a report. */
  readonly reportsParts: boolean;
}

/** Inputs and options of a run by name, one value each, so that a difference can be told in a line. */
export function describedRun(
  { source, readChip, inputs }: Scenario,
  {
    errors,
    thresholds,
    ...options
  }: Readonly<Record<string, unknown>> & {
    readonly errors: ProcessErrors;
    readonly thresholds: readonly Threshold[];
  },
): Record<string, unknown> {
  return {
    'target': source,
    'chip': readChip.chip.name,
    ...options,
    ...errors,
    'threshold': thresholds.map(({ key, limit }) => `${key}=${limit}`).join(' and '),
    'content of the target': shortHash(inputs['target']),
    'content of the chip': shortHash(inputs['chip']),
  };
}

function shortHash(hash = ''): string {
  return hash.slice(0, 'sha256:'.length + 12);
}

/**
 * Runs trials, keeping finished chunks in the folder of the results, and reports them. After an interrupt the
 * part that is done is reported, the chunks stay, and a message says how to go on.
 * @returns the exit code: 0, or 130 after an interrupt
 * @throws InputError when other results or another run's chunks are in the way
 */
export async function runKept(
  run: KeptRun,
  report: (outcome: PlanOutcome) => Promise<void>,
): Promise<number> {
  const { console, options, folder, runId, files, plans, enough } = run;
  const workers = sensibleWorkers(options.workers);
  const force = options.force === true;
  const store = await openChunkStore(
    folder,
    { runId, columns: plans[0]!.figures.length, description: run.description },
    { resume: options.resume === true, force },
  );
  let finished = false;
  try {
    // After the store, which can say more: what has changed since an unfinished run.
    await requireNoOtherRun({
      folder,
      files: files.map((name) => [name, '']),
      runId,
      command: 'yield',
      force,
    });
    for (const note of store.notes) console.message(note);
    const { value: outcome, interrupted } = await withInterrupt((signal) =>
      runPlans({
        plans,
        trials: options.trials,
        workers,
        signal,
        store,
        console,
        ...(enough === undefined ? {} : { enough }),
      }),
    );
    const done = outcome?.results.reduce((sum, { trials }) => sum + trials, 0) ?? 0;
    if (outcome !== undefined && done > 0 && (run.reportsParts || !interrupted)) await report(outcome);
    finished = !interrupted;
    if (finished) return 0;
    const all = options.trials * plans.length;
    console.warning(
      done === 0
        ? 'interrupted before the first chunk of trials was done'
        : `interrupted after ${done} of ${all} trials; go on with --resume`,
    );
    return INTERRUPTED;
  } finally {
    await store.close({ discard: finished });
  }
}
