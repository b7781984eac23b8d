import { printableText } from '../figure/printableText.js';
import { InputError } from '../errors/InputError.js';
import { runIdentity } from '../files/contentHash.js';
import { summarise } from '../statistics/summary.js';
import { aloneWith, COSTLY_SOURCES, without } from '../tolerance/errorSources.js';
import { columnOf, judgedFigures } from '../tolerance/thresholds.js';
import { createConsole } from './console.js';
import { shownSource } from './figureText.js';
import { finish } from './finish.js';
import { describedRun, runKept } from './keptRun.js';
import { shortNumber } from './messages.js';
import { reportHead } from './reportParts.js';
import type { PlanResults } from './runPlans.js';
import { textTable } from './textTable.js';
import { processOf, thresholdsOf } from './trialOptions.js';
import type { Scenario } from './trialScenario.js';
import { planOf } from './trialScenario.js';
import type { YieldOptions } from './yieldParts.js';
import { percent, scenarioBlocks, settledOptions, yieldBlock, yieldFolder } from './yieldParts.js';

/** `yield --budget`: what each error source costs alone, and what would be left without it. */
export async function runBudget(scenario: Scenario, options: YieldOptions): Promise<number> {
  const console = createConsole(options);
  const errors = processOf(scenario.readChip.chip.process, options);
  const thresholds = thresholdsOf(options, scenario.readChip.chip);
  const figures = judgedFigures(thresholds);
  const settled = { retune: options.retune, seed: options.seed, figures };
  const sources = COSTLY_SOURCES.filter((source) => errors[source] !== 0);
  if (sources.length < 2) {
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
    ...sources.map((source) => without(errors, source)),
  ].map((process) => planOf(scenario, process, settled));
  const folder = options.out ?? `${yieldFolder(scenario)}-budget`;
  const identity = { ...settledOptions(options), errors, thresholds, budget: true };
  const runId = runIdentity('yield', scenario.inputs, identity);
  const kept = {
    console,
    options,
    folder,
    runId,
    files: ['budget.csv', 'budget.svg'],
    description: describedRun(scenario, identity),
    plans,
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
    const costs: Budget = { together: together!, withoutErrors: withoutErrors!, budget };
    const { drawBudget } = await import('../figure/drawBudget.js');
    const caption = `target: ${shownSource(scenario.source)}; ${options.trials} chips each; retuning: ${options.retune}`;
    const svg = drawBudget(
      budget.map(({ source, alone, without: rest }) => ({
        source,
        alone: alone.infidelity,
        without: rest.infidelity,
      })),
      together!.infidelity,
      {
        confidence: options.confidence,
        title: scenario.readChip.chip.name,
        captionLines: [caption, `without any errors: ${shortNumber(withoutErrors!.infidelity.mean)}`],
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
  });
}

interface BudgetCost {
  readonly infidelity: { readonly mean: number; readonly standardError: number | null };
  readonly yield: { readonly share: number; readonly low: number; readonly high: number };
}

/** What was found of all sources together, of none, and of each, the most expensive one first. */
interface Budget {
  readonly together: BudgetCost;
  readonly withoutErrors: BudgetCost;
  readonly budget: readonly {
    readonly source: string;
    readonly alone: BudgetCost;
    readonly without: BudgetCost;
  }[];
}

function budgetCsv({ together, withoutErrors, budget }: Budget): string {
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
  ];
  return `${[header, ...rows.map((row) => row.join(','))].join('\n')}\n`;
}

function budgetTable({ together, withoutErrors, budget }: Budget): string {
  const fields = ({ infidelity, yield: { share } }: BudgetCost): string[] => [
    shortNumber(infidelity.mean),
    percent(share),
  ];
  return textTable(
    ['source', 'alone', 'yield', 'without it', 'yield'],
    [
      ['all together', ...fields(together), '', ''],
      ...budget.map(({ source, alone, without: rest }) => [source, ...fields(alone), ...fields(rest)]),
      ['no errors', ...fields(withoutErrors), '', ''],
    ],
  );
}
