import { printableText } from '../figure/printableText.js';
import { InputError } from '../errors/InputError.js';
import { openChunkStore } from '../files/chunkStore.js';
import { runIdentity } from '../files/contentHash.js';
import { sensibleWorkers } from '../files/sensibleWorkers.js';
import { INTERRUPTED, withInterrupt } from '../files/withInterrupt.js';
import { requireNoOtherRun } from '../files/writeResults.js';
import { summarise } from '../statistics/summary.js';
import { aloneWith, COSTLY_SOURCES, without } from '../tolerance/errorSources.js';
import { columnOf, judgedFigures } from '../tolerance/thresholds.js';
import { createConsole } from './console.js';
import { finish } from './finish.js';
import { shortNumber } from './messages.js';
import { reportHead } from './reportParts.js';
import type { PlanResults } from './runPlans.js';
import { runPlans } from './runPlans.js';
import { textTable } from './textTable.js';
import { processOf, thresholdsOf } from './trialOptions.js';
import type { Scenario } from './trialScenario.js';
import { planOf } from './trialScenario.js';
import type { YieldOptions } from './yield.js';
import { percent, scenarioBlocks, settledOptions, yieldBlock, yieldFolder } from './yield.js';

/** `yield --budget`: what each error source costs alone, and what would be left without it. */
export async function runBudget(
  argument: string,
  scenario: Scenario,
  options: YieldOptions,
): Promise<number> {
  const console = createConsole(options);
  const errors = processOf(scenario.readChip.chip.process, options);
  const thresholds = thresholdsOf(options);
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
    ...sources.map((source) => aloneWith(errors, source)),
    ...sources.map((source) => without(errors, source)),
  ].map((process) => planOf(scenario, process, settled));
  const folder = options.out ?? `${yieldFolder(argument, scenario)}-budget`;
  const identity = { ...settledOptions(options), errors, thresholds, budget: true };
  const runId = runIdentity('yield', scenario.inputs, identity);
  const workers = sensibleWorkers(options.workers);
  const names = ['budget.csv', 'budget.svg'].map((name) => [name, ''] as const);
  await requireNoOtherRun({ folder, files: names, runId, force: options.force === true });
  const store = await openChunkStore(
    folder,
    { runId, columns: figures.length, description: identity },
    { resume: options.resume === true, force: options.force === true },
  );
  for (const note of store.notes) console.message(note);
  let finished = false;
  try {
    const { value: outcome, interrupted } = await withInterrupt((signal) =>
      runPlans({ plans, trials: options.trials, workers, signal, store, console }),
    );
    if (outcome === undefined || interrupted) {
      console.warning('interrupted; go on with --resume');
      return INTERRUPTED;
    }
    const costOf = (results: PlanResults): BudgetCost => {
      const { mean, standardError } = summarise(columnOf(results.rows, figures.length, 0));
      const { share, low, high } = yieldBlock(results, figures, thresholds, options.confidence);
      return { infidelity: { mean: 1 - mean, standardError }, yield: { share, low, high } };
    };
    const [together, ...rest] = outcome.results.map(costOf);
    const budget = sources
      .map((source, k) => ({ source, alone: rest[k]!, without: rest[sources.length + k]! }))
      .sort((a, b) => b.alone.infidelity.mean - a.alone.infidelity.mean);
    const { drawBudget } = await import('../figure/drawBudget.js');
    const { chip } = scenario.readChip;
    const svg = drawBudget(
      budget.map(({ source, alone, without: rest }) => ({
        source,
        alone: alone.infidelity,
        without: rest.infidelity,
      })),
      together!.infidelity,
      {
        confidence: options.confidence,
        title: chip.name,
        captionLines: [`target: ${argument}; ${options.trials} chips each; retuning: ${options.retune}`],
      },
    );
    const header = [
      'source',
      'aloneInfidelity',
      'aloneStandardError',
      'aloneYield',
      'withoutInfidelity',
      'withoutStandardError',
      'withoutYield',
    ];
    const lines = [
      ['all', together!, together!] as const,
      ...budget.map(({ source, alone, without: rest }) => [source, alone, rest] as const),
    ].map(([source, alone, rest]) =>
      [
        source,
        alone.infidelity.mean,
        alone.infidelity.standardError ?? '',
        alone.yield.share,
        ...(source === 'all'
          ? ['', '', '']
          : [rest.infidelity.mean, rest.infidelity.standardError ?? '', rest.yield.share]),
      ].join(','),
    );
    await finish(console, options, {
      folder,
      files: new Map([
        ['budget.csv', `${[header.join(','), ...lines].join('\n')}\n`],
        ['budget.svg', svg],
      ]),
      report: {
        ...reportHead('yield', runId),
        ...scenarioBlocks(scenario),
        errors,
        retune: options.retune,
        thresholds,
        together,
        budget,
        seed: options.seed,
        seconds: performance.now() / 1000,
        trialsPerSecond: outcome.trialsPerSecond,
      },
      show: () => {
        console.result(
          `${printableText(argument)}: what each error source costs (mean infidelity; share of good chips), seed ${options.seed}\n`,
        );
        console.result(
          textTable(
            ['source', 'alone', 'yield', 'without it', 'yield'],
            [
              [
                'all together',
                shortNumber(together!.infidelity.mean),
                percent(together!.yield.share),
                '',
                '',
              ],
              ...budget.map(({ source, alone, without: rest }) => [
                source,
                shortNumber(alone.infidelity.mean),
                percent(alone.yield.share),
                shortNumber(rest.infidelity.mean),
                percent(rest.yield.share),
              ]),
            ],
          ),
        );
      },
    });
    finished = true;
    return 0;
  } finally {
    await store.close({ discard: finished });
  }
}

interface BudgetCost {
  readonly infidelity: { readonly mean: number; readonly standardError: number | null };
  readonly yield: { readonly share: number; readonly low: number; readonly high: number };
}
