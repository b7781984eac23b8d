import { InputError } from '../errors/InputError.js';
import type { Chunk } from '../files/chunkFile.js';
import type { ChunkStore } from '../files/chunkStore.js';
import type { PoolOutcome, PoolRun } from '../files/workerPool.js';
import { runChunks } from '../files/workerPool.js';
import { chunkTrials } from '../tolerance/chunking.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import type { Console } from './console.js';
import { createProgress } from './progress.js';
import type { TrialChunk, TrialJob } from './trialRunner.js';
import { trialRunner } from './trialRunner.js';

/** What the trials of one plan gave, as far as they went. */
export interface PlanResults {
  /** One row per trial in trial order. */
  readonly rows: Float64Array;
  readonly trials: number;
  readonly clamped: number;
  /** Trials whose refinement was ended by the clock. */
  readonly outOfTime: number;
}

export interface PlanRun {
  readonly plans: readonly TrialPlan[];
  /** Trials of each plan. */
  readonly trials: readonly number[];
  readonly workers: number;
  readonly signal?: AbortSignal;
  /** Where finished chunks are kept, if they are. */
  readonly store?: ChunkStore;
  /** Where these trials stand among others that are kept in the same store. */
  readonly place?: {
    /** Chunks in the store that come before. */
    readonly chunksBefore: number;
    /** Kept with each chunk, so that none is taken for one of another value. */
    readonly value: number;
  };
  /** Judged after each chunk, in the order of the trials; true ends the run. */
  readonly enough?: (results: PlanResults) => boolean;
  readonly console?: Console;
}

export interface PlanOutcome {
  readonly results: readonly PlanResults[];
  readonly interrupted: boolean;
  /** Trials that were run now, not taken from the store, by the second. */
  readonly trialsPerSecond: number;
  /** How many chunks all trials make. */
  readonly chunks: number;
}

/**
 * Runs the trials of plans on worker threads. Chunks are of a size that depends on the plan alone and are
 * taken in order, so the results are the same bytes for any number of workers and after a resume.
 * @throws InputError `run/size` when the results would fill the memory
 */
export async function runPlans(run: PlanRun): Promise<PlanOutcome> {
  const { plans, trials, store, place } = run;
  requireRoom(plans, trials);
  const jobs = jobsOf(plans, trials, place?.chunksBefore ?? 0);
  const label = place === undefined ? [] : [place.value];
  const columns = plans[0]!.figures.length;
  const rows = plans.map((_, plan) => new Float64Array(trials[plan]! * columns));
  const done = plans.map(() => 0);
  const clamped = plans.map(() => 0);
  const outOfTime = plans.map(() => 0);
  const resultsOf = (plan: number): PlanResults => ({
    rows: rows[plan]!.subarray(0, done[plan]! * columns),
    trials: done[plan]!,
    clamped: clamped[plan]!,
    outOfTime: outOfTime[plan]!,
  });
  const progress = createProgress(
    run.console,
    trials.reduce((sum, each) => sum + each, 0),
  );
  const started = performance.now();
  let fresh = 0;
  const chunks = {
    known: ({ number }: TrialJob): Promise<TrialChunk> | undefined =>
      store?.has(number) === true
        ? store.read(number).then((chunk) => keptChunk(chunk, place?.value))
        : undefined,
    onResult: async (
      chunk: TrialChunk,
      { plan, number, first, count }: TrialJob,
    ): Promise<'stop' | undefined> => {
      rows[plan]!.set(chunk.rows, first * columns);
      done[plan] = first + count;
      clamped[plan]! += chunk.clamped;
      outOfTime[plan]! += chunk.outOfTime;
      const known = store?.has(number) === true;
      if (!known) {
        fresh += count;
        const counters = [chunk.clamped, ...label, chunk.outOfTime];
        await store?.save({ number, firstTrial: first + 1, rows: chunk.rows, counters });
      }
      progress.advance(count, known);
      return run.enough?.(resultsOf(plan)) === true ? 'stop' : undefined;
    },
  };
  const ended = await endOf(run, jobs, chunks).finally(() => progress.end());
  const seconds = (performance.now() - started) / 1000;
  return {
    results: plans.map((_, plan) => resultsOf(plan)),
    interrupted: ended === 'aborted',
    trialsPerSecond: Math.round(fresh / seconds),
    chunks: jobs.length,
  };
}

/** @throws InputError `run/changed` for a chunk of another value, as another version of the search left it */
function keptChunk({ number, rows, counters }: Chunk, value: number | undefined): TrialChunk {
  const clamped = counters[0]!;
  if (value === undefined) return { rows, clamped, outOfTime: counters[1] ?? 0 };
  const of = counters[1];
  if (of === value) return { rows, clamped, outOfTime: counters[2] ?? 0 };
  throw new InputError(
    'run/changed',
    `chunk ${number} of what is kept is of the value ${of}, where this run tries ${value}`,
    'Begin anew with --force.',
  );
}

/** All judged figures are held in memory until they are written, in all about 60 bytes each: two gigabytes are enough. */
const MOST_VALUES = 2 ** 25;

function requireRoom(plans: readonly TrialPlan[], trials: readonly number[]): void {
  const most = Math.max(...trials);
  const values = plans.length * most * plans[0]!.figures.length;
  if (values <= MOST_VALUES) return;
  throw new InputError(
    'run/size',
    `${plans.length === 1 ? '' : `${plans.length} times `}${most} trials are more than memory holds`,
    'Give fewer --trials, points or thresholds.',
  );
}

type ChunkHandling = Required<Pick<PoolRun<TrialJob, TrialChunk>, 'known' | 'onResult'>>;

/** To start workers takes as long as so many chunks, which a search would pay at each of its values. */
const FEW_CHUNKS = 4;

/** Runs jobs, on workers if there are more than a few, or any that take long. */
async function endOf(
  { plans, workers, signal }: PlanRun,
  jobs: readonly TrialJob[],
  chunks: ChunkHandling,
): Promise<PoolOutcome['ended']> {
  const takesLong = plans.some(({ retune }) => retune === 'refine');
  if (jobs.length <= FEW_CHUNKS && !takesLong) return endOfFew(plans, jobs, chunks, signal);
  const outcome = await runChunks<TrialJob, TrialChunk>({
    workers,
    entry: new URL('./trialWorker.js', import.meta.url),
    setup: plans,
    jobs,
    nameOf: ({ first, count }) => `trials ${first + 1} to ${first + count}`,
    ...(signal === undefined ? {} : { signal }),
    ...chunks,
  });
  return outcome.ended;
}

/** The same as the workers do, here. */
async function endOfFew(
  plans: readonly TrialPlan[],
  jobs: readonly TrialJob[],
  chunks: ChunkHandling,
  signal: AbortSignal | undefined,
): Promise<PoolOutcome['ended']> {
  const run = trialRunner(plans);
  for (const job of jobs) {
    // Lets signals in.
    await new Promise((resolve) => setImmediate(resolve));
    if (signal?.aborted === true) return 'aborted';
    const verdict = await chunks.onResult((await chunks.known(job)) ?? run(job), job);
    if (verdict === 'stop') return 'stopped';
  }
  return 'all';
}

function jobsOf(plans: readonly TrialPlan[], trials: readonly number[], before: number): TrialJob[] {
  const jobs: TrialJob[] = [];
  plans.forEach((plan, index) => {
    const size = chunkTrials(plan);
    const all = trials[index]!;
    for (let first = 0; first < all; first += size) {
      const number = before + jobs.length + 1;
      jobs.push({ plan: index, number, first, count: Math.min(size, all - first) });
    }
  });
  return jobs;
}
