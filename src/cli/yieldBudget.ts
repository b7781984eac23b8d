import { printableText } from '../figure/printableText.js';
import { InputError } from '../errors/InputError.js';
import { runIdentity } from '../files/contentHash.js';
import { summarise } from '../statistics/summary.js';
import { aloneWith, CORRELATIONS, COSTLY_SOURCES, without } from '../tolerance/errorSources.js';
import type { MeanEstimate } from '../figure/meanSigns.js';
import type { Merit } from '../merit/merit.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { columnOf, countPassed } from '../tolerance/thresholds.js';
import { createConsole } from './console.js';
import { shownSource } from './figureText.js';
import { finish } from './finish.js';
import { describedRun, runKept } from './keptRun.js';
import { shortNumber } from './messages.js';
import { reportHead } from './reportParts.js';
import type { PlanResults } from './runPlans.js';
import { textTable } from './textTable.js';
import { processOf, thresholdsOf } from './trialOptions.js';
import { refineBlock, settledPlan, tellOutOfTime } from './trialRefinement.js';
import type { Scenario } from './trialScenario.js';
import { planOf } from './trialScenario.js';
import type { YieldOptions } from './yieldParts.js';
import { percent, scenarioBlocks, settledOptions, yieldBlock, yieldFolder } from './yieldParts.js';

/**
 * `yield --budget`: what each error source costs alone, and what would be left without it; what would be left
 * without each correlation.
 */
export async function runBudget(scenario: Scenario, options: YieldOptions): Promise<number> {
  const console = createConsole(options);
  const errors = processOf(scenario.readChip.chip.process, options);
  const thresholds = thresholdsOf(options, scenario.readChip.chip);
  const settled = settledPlan(options, scenario.readChip.chip, thresholds);
  const { figures } = settled;
  const sources = COSTLY_SOURCES.filter((source) => errors[source] !== 0);
  const correlations = CORRELATIONS.filter((source) => errors[source] !== 0);
  if (sources.length + correlations.length < 2) {
    throw new InputError(
      'usage/budget',
      `there is one error source only, ${sources[0]}`,
      'A budget compares several: give more with --error or in the chip file.',
    );
  }
  const plans = [
    errors,
    sources.reduce(without, errors),
    ...sources.map((source) => aloneWith(errors, source)),
    ...[...sources, ...correlations].map((source) => without(errors, source)),
  ].map((process) => planOf(scenario, process, settled));
  const folder = options.out ?? `${yieldFolder(scenario)}-budget`;
  const identity = { ...settledOptions(options), errors, thresholds, budget: [...sources, ...correlations] };
  const runId = runIdentity('yield', scenario.inputs, identity);
  const kept = {
    console,
    options,
    folder,
    runId,
    files: ['budget.csv', 'budget.svg'],
    description: describedRun(scenario, identity),
    plans,
    trials: plans.map(() => options.trials),
  };
  return runKept({ ...kept, reportsParts: false }, async (outcome) => {
    const costOf = (results: PlanResults): BudgetCost => {
      const { mean, standardError } = summarise(columnOf(results.rows, figures.length, 0));
      const { share, low, high } = yieldBlock(results, figures, thresholds, options.confidence);
      return { infidelity: { mean: 1 - mean, standardError }, yield: { share, low, high } };
    };
    const [together, withoutErrors, ...rest] = outcome.results.map(costOf);
    const budget = sources
      .map((source, k) => ({ source, alone: rest[k]!, without: rest[sources.length + k]! }))
      .sort((a, b) => b.alone.infidelity.mean - a.alone.infidelity.mean);
    const [asTheyStand] = outcome.results;
    const uncorrelated = outcome.results.slice(-correlations.length);
    const shaped = correlations
      .map((source, k) => ({
        source,
        without: rest[2 * sources.length + k]!,
        change: changeBetween(uncorrelated[k]!, asTheyStand!, figures, thresholds),
      }))
      .sort((a, b) => Math.abs(b.change.yield.mean) - Math.abs(a.change.yield.mean));
    const costs: Budget = {
      together: together!,
      withoutErrors: withoutErrors!,
      budget,
      ...(shaped.length === 0 ? {} : { correlations: shaped }),
    };
    const { drawBudget } = await import('../figure/drawBudget.js');
    const caption = `target: ${shownSource(scenario.source)}; ${options.trials} chips each; retuning: ${options.retune}`;
    const svg = drawBudget(
      [
        ...budget.map(({ source, alone, without: rest }) => ({
          source,
          alone: barOf(alone),
          without: barOf(rest),
        })),
        ...shaped.map(({ source, without: rest }) => ({ source, without: barOf(rest) })),
      ],
      barOf(together!),
      {
        confidence: options.confidence,
        title: scenario.readChip.chip.name,
        captionLines: [
          caption,
          `without any errors: ${shortNumber(Math.max(0, withoutErrors!.infidelity.mean))}`,
        ],
      },
    );
    await finish(console, options, {
      folder,
      files: new Map([
        ['budget.csv', budgetCsv(costs)],
        ['budget.svg', svg],
      ]),
      report: {
        ...reportHead('yield', runId),
        ...scenarioBlocks(scenario),
        errors,
        retune: options.retune,
        ...refineBlock(settled.refine, outcome.results),
        thresholds,
        ...costs,
        seed: options.seed,
        seconds: performance.now() / 1000,
        trialsPerSecond: outcome.trialsPerSecond,
      },
      show: () => {
        console.result(
          `${printableText(scenario.source)}: what each error source costs (mean infidelity; share of good chips), seed ${options.seed}\n`,
        );
        console.result(budgetTable(costs));
      },
    });
    tellOutOfTime(console, settled.refine, outcome.results);
  });
}

interface Mean {
  readonly mean: number;
  readonly standardError: number | null;
}

interface BudgetCost {
  readonly infidelity: Mean;
  readonly yield: { readonly share: number; readonly low: number; readonly high: number };
}

/**
 * What was found of all sources together, of none, of each, the most expensive one first, and of the
 * correlations, the one first that changes the yield most.
 */
interface Budget {
  readonly together: BudgetCost;
  readonly withoutErrors: BudgetCost;
  readonly budget: readonly {
    readonly source: string;
    readonly alone: BudgetCost;
    readonly without: BudgetCost;
  }[];
  /** Absent when nothing is correlated. */
  readonly correlations?: readonly {
    readonly source: string;
    /** All errors as they stand, but without this correlation. */
    readonly without: BudgetCost;
    readonly change: Change;
  }[];
}

/**
 * What a correlation changes: all errors as they stand, less the same without it. The same random numbers are
 * behind both, so that this is known better than either.
 */
interface Change {
  readonly infidelity: Mean;
  /** Of the share of good chips. */
  readonly yield: Mean;
}

function changeBetween(
  before: PlanResults,
  after: PlanResults,
  figures: readonly (keyof Merit)[],
  thresholds: readonly Threshold[],
): Change {
  const columns = figures.length;
  const difference = (valueOf: (row: Float64Array) => number): Mean => {
    const at = ({ rows }: PlanResults, trial: number): number =>
      valueOf(rows.subarray(trial * columns, (trial + 1) * columns));
    const each = Float64Array.from({ length: after.trials }, (_, k) => at(after, k) - at(before, k));
    const { mean, standardError } = summarise(each);
    return { mean, standardError };
  };
  return {
    infidelity: difference(([fidelity]) => 1 - fidelity!),
    yield: difference((row) => countPassed(row, figures, thresholds)),
  };
}

function barOf({ infidelity, yield: { share } }: BudgetCost): MeanEstimate {
  return { ...infidelity, share };
}

function budgetCsv({ together, withoutErrors, budget, correlations = [] }: Budget): string {
  const fields = ({ infidelity, yield: { share } }: BudgetCost): (number | string)[] => [
    infidelity.mean,
    infidelity.standardError ?? '',
    share,
  ];
  const header =
    'source,aloneInfidelity,aloneStandardError,aloneYield,withoutInfidelity,withoutStandardError,withoutYield';
  const rows = [
    ['all', ...fields(together), '', '', ''],
    ['none', ...fields(withoutErrors), '', '', ''],
    ...budget.map(({ source, alone, without: rest }) => [source, ...fields(alone), ...fields(rest)]),
    ...correlations.map(({ source, without: rest }) => [source, '', '', '', ...fields(rest)]),
  ];
  return `${[header, ...rows.map((row) => row.join(','))].join('\n')}\n`;
}

function budgetTable({ together, withoutErrors, budget, correlations = [] }: Budget): string {
  const fields = ({ infidelity, yield: { share } }: BudgetCost): string[] => [
    shortNumber(Math.max(0, infidelity.mean)),
    percent(share),
  ];
  return textTable(
    ['source', 'alone', 'yield', 'without it', 'yield'],
    [
      ['all together', ...fields(together), '', ''],
      ...budget.map(({ source, alone, without: rest }) => [source, ...fields(alone), ...fields(rest)]),
      ...correlations.map(({ source, without: rest }) => [source, '', '', ...fields(rest)]),
      ['no errors', ...fields(withoutErrors), '', ''],
    ],
  );
}
