import { readFile } from 'node:fs/promises';
import { join } from 'node:path';
import type { ProcessErrors } from '../chip/Chip.js';
import type { ChunkStore } from '../files/chunkStore.js';
import { openChunkStore } from '../files/chunkStore.js';
import { sensibleWorkers } from '../files/sensibleWorkers.js';
import { INTERRUPTED, withInterrupt } from '../files/withInterrupt.js';
import { REPORT_FILE, requireNoOtherRun } from '../files/writeResults.js';
import type { Threshold } from '../tolerance/thresholds.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import type { Console } from './console.js';
import type { PlanOutcome, PlanResults } from './runPlans.js';
import { runPlans } from './runPlans.js';
import type { Scenario } from './trialScenario.js';

/** A run that keeps its finished chunks in the folder of its results until those are written. */
export interface KeptFolder {
  readonly console: Console;
  readonly options: {
    readonly resume?: boolean;
    readonly force?: boolean;
    readonly json?: boolean;
  };
  readonly command: string;
  readonly folder: string;
  readonly runId: string;
  /** Names of the results, besides the report. */
  readonly files: readonly string[];
  /** Values in a row of a chunk. */
  readonly columns: number;
  /** Inputs and options, so that a refused resume can say what has changed. */
  readonly description: unknown;
}

/** A run of the trials of given plans. */
export interface KeptRun extends Omit<KeptFolder, 'command' | 'columns' | 'options'> {
  /** `yield` when absent. */
  readonly command?: string;
  readonly options: KeptFolder['options'] & { readonly workers?: number };
  /** Trials of each plan. */
  readonly trials: readonly number[];
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
 * Opens the store of a run, lets it work, and closes the store: the chunks go when the results are written,
 * and stay for a resume otherwise. A run that is resumed although its results are there has nothing left to
 * do.
 * @param work true when the results are written, false after an interrupt
 * @returns the exit code: 0, or 130 after an interrupt
 * @throws InputError when other results or another run's chunks are in the way, and what `work` throws
 */
export async function keepingChunks(
  { console, options, command, folder, runId, files, columns, description }: KeptFolder,
  work: (store: ChunkStore) => Promise<boolean>,
): Promise<number> {
  const force = options.force === true;
  const resume = options.resume === true;
  const store = await openChunkStore(folder, { runId, columns, description }, { resume, force });
  let finished = false;
  try {
    // After the store, which can say more: what has changed since an unfinished run.
    const earlier = await requireNoOtherRun({
      folder,
      files: files.map((name) => [name, '']),
      runId,
      command,
      force,
    });
    if (resume && !force && earlier?.runId === runId && earlier.whole) {
      finished = true;
      console.message(`the run is finished: its results are in ${folder}`);
      if (options.json === true) process.stdout.write(await readFile(join(folder, REPORT_FILE)));
      return 0;
    }
    for (const note of store.notes) console.message(note);
    finished = await work(store);
    return finished ? 0 : INTERRUPTED;
  } finally {
    await store.close({ discard: finished });
  }
}

/**
 * Runs trials, keeping finished chunks in the folder of the results, and reports them. After an interrupt the
 * part that is done is reported, the chunks stay, and a message says how to go on.
 * @returns the exit code: 0, or 130 after an interrupt
 * @throws as `keepingChunks`
 */
export async function runKept(
  run: KeptRun,
  report: (outcome: PlanOutcome) => Promise<void>,
): Promise<number> {
  const { console, options, plans, trials, enough } = run;
  const workers = sensibleWorkers(options.workers);
  const kept = { command: 'yield', ...run, columns: plans[0]!.figures.length };
  return keepingChunks(kept, async (store) => {
    const { value: outcome, interrupted } = await withInterrupt((signal) =>
      runPlans({
        plans,
        trials,
        workers,
        signal,
        store,
        console,
        ...(enough === undefined ? {} : { enough }),
      }),
    );
    const done = outcome?.results.reduce((sum, results) => sum + results.trials, 0) ?? 0;
    if (outcome !== undefined && done > 0 && (run.reportsParts || !interrupted)) await report(outcome);
    if (!interrupted) return true;
    const all = trials.reduce((sum, each) => sum + each, 0);
    console.warning(
      done === 0
        ? 'interrupted before the first chunk of trials was done'
        : `interrupted after ${done} of ${all} trials; go on with --resume`,
    );
    return false;
  });
}
