import type { Command } from 'commander';
import type { ProcessErrors } from '../chip/Chip.js';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import type { drawSweepCurve } from '../figure/drawSweepCurve.js';
import { printableText } from '../figure/printableText.js';
import { runIdentity } from '../files/contentHash.js';
import { sensibleWorkers } from '../files/sensibleWorkers.js';
import { withInterrupt } from '../files/withInterrupt.js';
import type { Interval } from '../statistics/binomialInterval.js';
import { clopperPearson } from '../statistics/binomialInterval.js';
import { normalQuantile } from '../statistics/normalDistribution.js';
import { ERROR_SOURCES } from '../tolerance/errorSources.js';
import type { ToleranceEstimate, TriedValue, YieldCount } from '../tolerance/findTolerance.js';
import { bracketSoFar } from '../tolerance/findTolerance.js';
import { portsTheory, toleranceTheory } from '../tolerance/smallErrorTheory.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { countPassed } from '../tolerance/thresholds.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import type { ChipOptions, OutputOptions, TargetOptions } from './commandOptions.js';
import { addChipOptions, addOutputOptions, addTargetOptions } from './commandOptions.js';
import type { Console } from './console.js';
import { createConsole } from './console.js';
import { shownSource } from './figureText.js';
import { finish } from './finish.js';
import { describedRun, keepingChunks } from './keptRun.js';
import { counted, shortNumber } from './messages.js';
import { reportHead } from './reportParts.js';
import { runPlans } from './runPlans.js';
import { textTable } from './textTable.js';
import type { QuantitySearch } from './toleranceSearch.js';
import {
  exampleOf,
  FEWEST_MODES,
  findBy,
  greatestOf,
  meaningOf,
  nowhereWords,
  searchOf,
} from './toleranceSearch.js';
import type { TrialOptions } from './trialOptions.js';
import {
  addTrialOptions,
  parseShare,
  processOf,
  tellMissingPortShifters,
  thresholdsOf,
} from './trialOptions.js';
import type { TimedTrials } from './trialRefinement.js';
import { refineBlock, settledPlan, tellOutOfTime } from './trialRefinement.js';
import type { Quantity, Scenario } from './trialScenario.js';
import { infidelityWithoutErrors, loadScenario, planAt, QUANTITIES } from './trialScenario.js';
import { QUANTITY_LABELS } from './yieldSweep.js';
import { percent, scenarioBlocks, settledOptions, thresholdWords, yieldFolder } from './yieldParts.js';

interface ToleranceOptions extends OutputOptions, ChipOptions, TargetOptions, TrialOptions {
  readonly source?: string;
  readonly yield: number;
  readonly resume?: boolean;
}

/** Adds the command `tolerance TARGET`. */
export function addToleranceCommand(parent: Command, setExitCode: (code: number) => void): void {
  const command = parent
    .command('tolerance')
    .argument('<target>', 'matrix file, formula, or haar(8) for a new random target in each trial')
    .summary('find the error that a design can stand')
    .description(
      'Find the largest error of one source (the fewest bits), or the largest value of a quantity of the design, for which\n' +
        'the yield still holds; other sources are as the chip file has them.\n' +
        'The same random chips are used at every value; the interval says what the sampling leaves open.\n' +
        'Finished chunks are kept: after Ctrl-C or a crash --resume goes on to the same bytes.',
    )
    .option('--source <name>', `what is looked for: ${QUANTITIES.join(', ')} (default: sigma)`)
    .option('--yield <share>', 'share of good chips wanted', parseShare('--yield'), 0.9);
  addTrialOptions(command, 2000).option('--resume', 'go on with an interrupted run');
  addChipOptions(command);
  addTargetOptions(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Where the search begins and ends: couplingRatio goes from 0.5 up, modes from 2 to 256 (write N in the formula), bits from 24 down, everything else
from 0 up. Growth is taken to do harm. Where it may do good again, for modes and correlationLength, the yield holds at every value of a
ladder up to the answer, and what lies beyond is not looked at; the report lists the ladder.

Examples:
  phasewright tolerance "haar(8)"
  phasewright tolerance target.npy --chip my.chip.json --source sigma --yield 0.9 --threshold fidelity=0.99
  phasewright tolerance "dft(16)" --source phaseSigma --retune cell --trials 5000
  phasewright tolerance "dft(N)" --source modes --sigma 0.01`,
    )
    .action(async (argument: string, options: ToleranceOptions) => {
      setExitCode(await runTolerance(argument, options));
    });
}

/** What is looked for, of which chips, and how. */
interface Inquiry {
  readonly console: Console;
  readonly options: ToleranceOptions;
  readonly scenario: Scenario;
  readonly thresholds: readonly Threshold[];
  readonly errors: ProcessErrors;
  readonly source: Quantity;
  readonly search: QuantitySearch;
  readonly planFor: (value: number) => Promise<TrialPlan>;
  readonly refine: TrialPlan['refine'];
  /** What the trials of each value gave, as they come. */
  readonly results: TimedTrials[];
  readonly folder: string;
  readonly runId: string;
}

const RESULT_FILES = ['tolerance.csv', 'tolerance.svg'] as const;

async function runTolerance(argument: string, options: ToleranceOptions): Promise<number> {
  const console = createConsole(options);
  const source = searchedSource(options.source ?? 'sigma');
  const scenario = await loadScenario(argument, options, source === 'modes' ? FEWEST_MODES : undefined);
  const { chip } = scenario.readChip;
  const thresholds = thresholdsOf(options, chip);
  tellMissingPortShifters(console, chip, thresholds);
  const given = processOf(chip.process, options, source);
  const errors = ERROR_SOURCES.some((name) => name === source) ? { ...given, [source]: 0 } : given;
  const settled = settledPlan(options, chip, thresholds);
  const { figures } = settled;
  const search = searchOf(source, chip.mesh);
  const planFor = (value: number): Promise<TrialPlan> => planAt(scenario, errors, settled, source, value);
  // What cannot be is refused before anything is kept.
  await planFor(exampleOf(search));
  const workers = sensibleWorkers(options.workers);
  const folder = options.out ?? yieldFolder(scenario, 'tolerance');
  const identity = {
    ...settledOptions(options),
    errors,
    thresholds,
    source,
    yield: options.yield,
    search,
  };
  const runId = runIdentity('tolerance', scenario.inputs, identity);
  const kept = {
    console,
    options,
    command: 'tolerance',
    folder,
    runId,
    files: RESULT_FILES,
    columns: figures.length,
    description: describedRun(scenario, identity),
  };
  const results: TimedTrials[] = [];
  const asked = { console, options, scenario, thresholds, errors, source, search, planFor, folder, runId };
  const inquiry = { ...asked, refine: settled.refine, results };
  return keepingChunks(kept, async (store) => {
    const tried: TriedValue[] = [];
    let chunksBefore = 0;
    const { value: found } = await withInterrupt((signal) => {
      const count = async (value: number): Promise<YieldCount> => {
        const plans = [await planFor(value)];
        const place = { chunksBefore, value };
        const { trials } = options;
        const outcome = await runPlans({ plans, trials: [trials], workers, signal, store, place, console });
        chunksBefore += outcome.chunks;
        results.push({ trials: outcome.results[0]!.trials, outOfTime: outcome.results[0]!.outOfTime });
        const passed = countPassed(outcome.results[0]!.rows, figures, thresholds);
        if (!outcome.interrupted) tried.push({ value, passed, trials });
        signal.throwIfAborted();
        return { passed, trials };
      };
      return findBy(search, { yieldWanted: options.yield, confidence: options.confidence, count });
    });
    if (found === undefined) {
      tellInterrupted(inquiry, tried, store.finished().length > 0);
      return false;
    }
    await reportTolerance(inquiry, found);
    return true;
  });
}

/** Says between which values the tolerance lies so far, and how to go on. */
function tellInterrupted(
  { console, options, source, search }: Inquiry,
  tried: readonly TriedValue[],
  anyKept: boolean,
): void {
  const { holds, fails } = bracketSoFar(tried, options.yield, search.kind !== 'fewest');
  const parts = [
    ...(holds === undefined ? [] : [`holds at ${source} ${shortNumber(holds)}`]),
    ...(fails === undefined ? [] : [`fails at ${source} ${shortNumber(fails)}`]),
  ];
  const words = parts.length === 0 ? '' : `, where the yield ${parts.join(' and ')}`;
  const done = tried.length === 0 ? 'a part of the first value' : counted(tried.length, 'value');
  console.warning(
    anyKept
      ? `interrupted after ${done}${words}; go on with --resume`
      : 'interrupted before the first chunk of trials was done',
  );
}

/** The estimate in closed form, where there is one. */
async function theoryOf(
  { options, scenario, thresholds, source, search, planFor }: Inquiry,
  { outcome, value }: ToleranceEstimate,
): Promise<number | null> {
  const [{ key, limit }, second] = thresholds as readonly [Threshold, ...Threshold[]];
  if (key !== 'fidelity' || second !== undefined) return null;
  const quantile = normalQuantile(options.yield);
  if (source !== 'modes') {
    const plan = await planFor(exampleOf(search));
    return toleranceTheory(plan, source, limit, quantile, infidelityWithoutErrors(scenario));
  }
  if (outcome !== 'found') return null;
  const flawed = infidelityWithoutErrors(await scenario.at('modes', value));
  return portsTheory(await planFor(value), limit, quantile, flawed);
}

async function reportTolerance(inquiry: Inquiry, found: ToleranceEstimate): Promise<void> {
  const { console, options, scenario, thresholds, errors, source, search, folder, runId } = inquiry;
  const theory = await theoryOf(inquiry, found);
  const points = found.tried.map(({ value, passed, trials }) => ({
    value,
    passed,
    trials,
    share: passed / trials,
    ...clopperPearson(passed, trials, options.confidence),
  }));
  const { drawSweepCurve } = await import('../figure/drawSweepCurve.js');
  const csv = ['value,passed,trials,share,low,high'].concat(
    points.map((point) =>
      [point.value, point.passed, point.trials, point.share, point.low, point.high].join(','),
    ),
  );
  const { outcome } = found;
  const [value, low, high] = [found.value, found.low, found.high].map((end) =>
    Number.isFinite(end) ? end : null,
  );
  await finish(console, options, {
    folder,
    files: new Map([
      ['tolerance.csv', `${csv.join('\n')}\n`],
      ['tolerance.svg', drawSweepCurve(...figureOf(inquiry, found, points))],
    ]),
    report: {
      ...reportHead('tolerance', runId),
      ...scenarioBlocks(scenario),
      errors,
      retune: options.retune,
      ...refineBlock(inquiry.refine, inquiry.results),
      thresholds,
      tolerance: {
        source,
        outcome,
        value,
        low,
        high,
        yield: options.yield,
        confidence: options.confidence,
        largestTried: greatestOf(search),
        meaning: meaningOf(source, search),
        ...(search.kind === 'ladder' ? { ladder: search.rungs } : {}),
      },
      theory: { value: theory },
      tried: points,
      seed: options.seed,
      seconds: performance.now() / 1000,
    },
    show: () => showTolerance(inquiry, found, theory),
  });
  tellOutOfTime(console, inquiry.refine, inquiry.results);
  if (outcome === 'holds nowhere') console.warning(nowhereWords(source, search));
}

function figureOf(
  { options, scenario, thresholds, source, search }: Inquiry,
  found: ToleranceEstimate,
  points: readonly (Interval & { readonly value: number; readonly share: number })[],
): Parameters<typeof drawSweepCurve> {
  const ladderOfLengths = search.kind === 'ladder' && !search.whole;
  // A logarithmic axis, on which lengths of all sizes have their room, has no 0.
  const [first] = points;
  const atZero = ladderOfLengths && first?.value === 0 && points.length > 1 ? first : undefined;
  const shown = atZero === undefined ? points : points.slice(1);
  const { value, low, high } = found;
  const mark = {
    value,
    text: `${percent(options.yield)} at ${shownValue(value, search)} (${shownValue(low, search)} to ${shownValue(high, search)})`,
  };
  return [
    shown.map((point) => ({ x: point.value, share: point.share, low: point.low, high: point.high })),
    {
      label: QUANTITY_LABELS[source],
      threshold: thresholds.map(thresholdWords).join(' and '),
      confidence: options.confidence,
      logX: atZero !== undefined,
      title: titleOf(source, scenario),
      ...(Number.isFinite(value) && !(atZero !== undefined && value === 0) ? { mark } : {}),
      captionLines: [
        `target: ${shownSource(scenario.source)}; ${options.trials} chips at each value; retuning: ${options.retune}`,
        ...(atZero === undefined ? [] : [`not shown: ${percent(atZero.share)} at 0, without correlation`]),
      ],
    },
  ];
}

function showTolerance(
  { console, options, scenario, thresholds, source, search }: Inquiry,
  { value, low, high, tried }: ToleranceEstimate,
  theory: number | null,
): void {
  console.result(
    `${printableText(scenario.source)} on ${printableText(titleOf(source, scenario))}: a yield of ${percent(options.yield)} ` +
      `with ${thresholds.map(thresholdWords).join(' and ')} holds ${search.kind === 'fewest' ? 'from' : 'up to'}\n`,
  );
  console.result(
    textTable(
      ['source', 'value', 'low', 'high', ...(theory === null ? [] : ['theory'])],
      [
        [
          source,
          ...[value, low, high].map((end) => shownValue(end, search)),
          ...(theory === null ? [] : [shortNumber(theory)]),
        ],
      ],
    ),
  );
  if (search.kind === 'ladder') console.result(`\nThe value is ${meaningOf(source, search)}.`);
  console.result(
    `\n${options.trials} chips at each of ${counted(tried.length, 'value')}, retuning: ${options.retune}, seed ${options.seed}`,
  );
}

/** The chip, or what chips of all sizes have in common. */
function titleOf(source: Quantity, { readChip: { chip } }: Scenario): string {
  return source === 'modes' ? `${chip.mesh.layout} meshes` : chip.name;
}

function shownValue(value: number, search: QuantitySearch): string {
  return value === Infinity ? `over ${greatestOf(search)}` : shortNumber(value);
}

function searchedSource(name: string): Quantity {
  const known = QUANTITIES.find((quantity) => quantity === name);
  if (known !== undefined) return known;
  const near = nearestName(name, QUANTITIES);
  throw new InputError(
    'usage/source',
    `no tolerance is found for ${name}`,
    near === undefined ? `Sources are ${QUANTITIES.join(', ')}.` : `Did you mean ${near}?`,
  );
}
