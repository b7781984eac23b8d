import { spawnSync } from 'node:child_process';
import { existsSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { NO_ERRORS } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { runPlans } from '../../src/cli/runPlans.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { createTrialEngine } from '../../src/tolerance/createTrialEngine.js';
import type { Retuning } from '../../src/program/retunings.js';
import type { TrialPlan } from '../../src/tolerance/TrialPlan.js';
import type { Yardstick } from './measuring.js';
import { machineLine, medianOf, processorMicroseconds, startYardstick } from './measuring.js';

/** What is aimed at: a trial takes at most so many zgemm, and NumPy's at least so many of ours. */
const TARGETS = [
  { modes: 8, products: 2, numpy: null },
  { modes: 16, products: 6, numpy: null },
  { modes: 32, products: 6, numpy: 10 },
  { modes: 64, products: 5, numpy: 10 },
  { modes: 128, products: 5, numpy: 10 },
  { modes: 256, products: 5, numpy: null },
] as const;
const MOST_FOR_RETUNING = 2;

/** Standard deviation of the coupling ratios; trials.py has the same. */
const SIGMA = 0.02;
const BATCH_MICROSECONDS = 10_000;
const ROUNDS = { least: 7, most: 41, milliseconds: 5000 } as const;

function planFor(modes: number, retune: Retuning): TrialPlan {
  const errors = { ...NO_ERRORS, sigma: SIGMA };
  const target = haarUnitary(modes, 1);
  return { chip: idealChip(modes), target, errors, retune, seed: 1, figures: ['fidelity'] };
}

/** Makes a function that runs a batch of trials and gives the processor time of one in microseconds. */
function timedTrials(plan: TrialPlan): () => number {
  const engine = createTrialEngine(plan);
  let first = 0;
  const batchOf = (count: number): (() => number) => {
    const rows = new Float64Array(count);
    return () => {
      const start = processorMicroseconds();
      engine.run(first, count, rows);
      first += count;
      return (processorMicroseconds() - start) / count;
    };
  };
  const warmUp = batchOf(2);
  const end = performance.now() + 100;
  while (performance.now() < end) warmUp();
  const rough = medianOf(Array.from({ length: 5 }, batchOf(20)));
  return batchOf(2 * Math.max(1, Math.round(BATCH_MICROSECONDS / rough / 2)));
}

interface Round {
  readonly once: number;
  readonly retuned: number;
  readonly product: number;
  readonly numpy: number;
}

/** Ours, theirs, ours, theirs: when the machine becomes slower, both do. */
async function measureRounds(modes: number, yardstick: Yardstick | null): Promise<Round[]> {
  const once = timedTrials(planFor(modes, 'none'));
  const retuned = timedTrials(planFor(modes, 'cell'));
  const theirs = async (name: string): Promise<number> => (await yardstick?.ask(`${name} ${modes}`)) ?? NaN;
  // The first question makes the matrices.
  await theirs('zgemm');
  await theirs('numpy');
  const rounds: Round[] = [];
  const end = performance.now() + ROUNDS.milliseconds;
  while (rounds.length < ROUNDS.least || (rounds.length < ROUNDS.most && performance.now() < end)) {
    const [ours, product] = [once(), await theirs('zgemm')];
    const numpy = await theirs('numpy');
    rounds.push({ once: ours, retuned: retuned(), product, numpy });
  }
  return rounds;
}

const print = (line: string): void => void process.stdout.write(`${line}\n`);
const cell = (value: number): string => value.toPrecision(3).padStart(10);
/** A median of ratios, what it should be, and a mark where it is not. */
function judged(ratio: number, sign: '<=' | '>=', limit: number | null): string {
  if (limit === null) return `${cell(ratio)}         `;
  const met = sign === '<=' ? ratio <= limit : ratio >= limit;
  return `${cell(ratio)} ${sign} ${String(limit).padEnd(2)} ${met ? ' ' : '!'} `;
}

async function printTrials(yardstick: Yardstick | null): Promise<void> {
  const theirs = yardstick === null ? '' : '     zgemm     NumPy  none/zgemm         NumPy/none       ';
  print(`   N      none      cell   cell/none       ${theirs} rounds`);
  for (const { modes, products, numpy } of TARGETS) {
    const rounds = await measureRounds(modes, yardstick);
    const median = (of: (round: Round) => number): number => medianOf(rounds.map(of));
    const ours = [median((r) => r.once), median((r) => r.retuned)].map(cell).join('');
    const retuning = judged(
      median((r) => r.retuned / r.once),
      '<=',
      MOST_FOR_RETUNING,
    );
    const compared = [
      cell(median((r) => r.product)),
      cell(median((r) => r.numpy)),
      judged(
        median((r) => r.once / r.product),
        '<=',
        products,
      ),
      judged(
        median((r) => r.numpy / r.once),
        '>=',
        numpy,
      ),
    ].join('');
    const count = String(rounds.length).padStart(7);
    print(`${String(modes).padStart(4)}${ours}${retuning}${yardstick === null ? '' : compared}${count}`);
  }
}

/** What was measured from a quarter of a run on: starting threads and compiling are not counted. */
interface WorkersRun {
  /** By the time of day. */
  readonly trialsPerSecond: number;
  /** Processor time of a trial in microseconds, all threads together. */
  readonly microseconds: number;
}

async function runWorkers(plan: TrialPlan, trials: number, workers: number): Promise<WorkersRun> {
  const marks: { readonly at: number; readonly used: number; readonly trials: number }[] = [];
  const enough = (results: { readonly trials: number }): boolean => {
    marks.push({ at: performance.now(), used: processorMicroseconds(), trials: results.trials });
    return false;
  };
  await runPlans({ plans: [plan], trials: [trials], workers, enough });
  const from = marks[marks.length >> 2]!;
  const to = marks.at(-1)!;
  const done = to.trials - from.trials;
  return {
    trialsPerSecond: (1000 * done) / (to.at - from.at),
    microseconds: (to.used - from.used) / done,
  };
}

/**
 * On a busy machine two workers get no more time than one; what a trial costs then tells how well they would
 * do.
 */
async function printWorkers(): Promise<void> {
  print('\nWorkers, taken in turns: trials a second by the time of day, and us of processor time a trial');
  print('   N     1 rate    2 rate   two/one    1 cost    2 cost');
  for (const { modes, trials } of [
    { modes: 8, trials: 1_000_000 },
    { modes: 64, trials: 8_000 },
  ]) {
    const plan = planFor(modes, 'none');
    const pairs: (readonly [WorkersRun, WorkersRun])[] = [];
    for (let k = 0; k < 5; k++) {
      pairs.push([await runWorkers(plan, trials, 1), await runWorkers(plan, trials, 2)]);
    }
    const median = (of: (one: WorkersRun, two: WorkersRun) => number): string =>
      cell(medianOf(pairs.map(([one, two]) => of(one, two))));
    print(
      String(modes).padStart(4) +
        ' ' +
        median((one) => one.trialsPerSecond) +
        median((_, two) => two.trialsPerSecond) +
        median((one, two) => two.trialsPerSecond / one.trialsPerSecond) +
        median((one) => one.microseconds) +
        median((_, two) => two.microseconds),
    );
  }
}

/** Greatest memory of a command in MB, or null when it failed. */
function peakMemory(argument: string, trials: number): number | null {
  const main = fileURLToPath(new URL('../../dist/cli/main.js', import.meta.url));
  if (!existsSync(main)) return null;
  const out = mkdtempSync(join(tmpdir(), 'phasewright-bench-'));
  const tell = 'process.on("exit",()=>process.stderr.write(`peak ${process.resourceUsage().maxRSS}\\n`))';
  try {
    const { status, stderr } = spawnSync(
      process.execPath,
      ['--import', `data:text/javascript,${encodeURIComponent(tell)}`, main, 'yield', argument]
        .concat(['--sigma', String(SIGMA), '--trials', String(trials), '--workers', '2'])
        .concat(['--quiet', '--out', join(out, 'yield')]),
      { encoding: 'utf8' },
    );
    if (status !== 0) return null;
    // Workers may tell too; the main thread is the last one.
    const kilobytes = Array.from(stderr.matchAll(/^peak (\d+)$/gm)).at(-1)?.[1];
    return kilobytes === undefined ? null : Number(kilobytes) / 1024;
  } finally {
    rmSync(out, { recursive: true, force: true });
  }
}

function printMemory(): void {
  print('\nPeak memory of the built command with 2 workers, limit 300 MB for a million trials at N = 64');
  for (const [argument, trials] of [
    ['haar(8, 1)', 1_000_000],
    ['haar(64, 1)', 10_000],
  ] as const) {
    const peak = peakMemory(argument, trials);
    const shown = peak === null ? 'not built, or failed' : `${peak.toFixed(0)} MB`;
    print(`  yield "${argument}" --trials ${trials}: ${shown}`);
  }
}

/** Both programs must find E[1 - F] = 2 (N - 1) sigma^2, or they do not simulate the same errors. */
async function printCheck(yardstick: Yardstick | null): Promise<void> {
  const modes = 8;
  const rows = new Float64Array(20_000);
  createTrialEngine(planFor(modes, 'none')).run(0, rows.length, rows);
  const infidelity = 1 - rows.reduce((sum, fidelity) => sum + fidelity, 0) / rows.length;
  const ours = infidelity / (2 * (modes - 1) * SIGMA ** 2);
  const theirs = yardstick === null ? '' : `, NumPy ${(await yardstick.ask(`check ${modes}`)).toFixed(3)}`;
  print(`Mean infidelity over the small-error law at N = ${modes}: ours ${ours.toFixed(3)}${theirs}`);
}

async function printHead(yardstick: Yardstick | null): Promise<void> {
  print(machineLine());
  print('One trial (normals, cells, propagation, trace; rectangular; splitter errors), us of processor time');
  print('on one core: medians, and medians of the ratios of neighbours in time. ! where a target is missed.');
  if (yardstick === null) return print('No yardsticks: python3 with NumPy and SciPy was not found');
  const call = (await yardstick.ask('zgemm 1')).toFixed(2);
  print(
    `Yardsticks in turns with ours, one thread, ${yardstick.version}: zgemm called through SciPy (the call`,
  );
  print(`alone, N = 1: ${call} us), and the same trial as a vectorised NumPy program`);
}

const yardstick = await startYardstick('trials.py');
await printHead(yardstick);
await printCheck(yardstick);
await printTrials(yardstick);
yardstick?.close();
await printWorkers();
printMemory();
