import type { Command } from 'commander';
import { InputError } from '../errors/InputError.js';
import { printableText } from '../figure/printableText.js';
import { runIdentity } from '../files/contentHash.js';
import { npyTable } from '../files/npyTable.js';
import type { Merit } from '../merit/merit.js';
import { isUpperLimit } from '../merit/merit.js';
import { clopperPearson } from '../statistics/binomialInterval.js';
import type { Summary } from '../statistics/summary.js';
import { summarise } from '../statistics/summary.js';
import { infidelityTheory } from '../tolerance/smallErrorTheory.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { columnOf, countPassed } from '../tolerance/thresholds.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import { addChipOptions, addOutputOptions, addTargetOptions } from './commandOptions.js';
import type { Console } from './console.js';
import { createConsole } from './console.js';
import { shownSource } from './figureText.js';
import { finish } from './finish.js';
import { counted, shortNumber } from './messages.js';
import { describedRun, runKept } from './keptRun.js';
import { MERIT_NAMES, reportHead, shownMerit } from './reportParts.js';
import type { PlanOutcome, PlanResults } from './runPlans.js';
import { replayTrial } from './replayTrial.js';
import { runBudget } from './yieldBudget.js';
import { runSweep } from './yieldSweep.js';
import {
  addTrialOptions,
  parseShare,
  processOf,
  tellMissingPortShifters,
  thresholdsOf,
  wholeNumberFor,
} from './trialOptions.js';
import { refineBlock, settledPlan, tellOutOfTime } from './trialRefinement.js';
import type { Scenario } from './trialScenario.js';
import { infidelityWithoutErrors, loadScenario, planOf } from './trialScenario.js';
import type { YieldOptions } from './yieldParts.js';
import {
  percent,
  requireLight,
  scenarioBlocks,
  settledOptions,
  thresholdWords,
  yieldBlock,
  yieldFolder,
} from './yieldParts.js';

/** Adds the command `yield TARGET`. */
export function addYieldCommand(parent: Command, setExitCode: (code: number) => void): void {
  const command = parent
    .command('yield')
    .argument('<target>', 'matrix file, formula, or haar(8) for a new random target in each trial')
    .summary('find what share of fabricated chips will be good')
    .description(
      'Sample chips with the errors of a process, program and simulate each, and say what share keeps the thresholds.\n' +
        'Writes report.json, trials.npy (a row per trial, a column per judged figure), histogram.svg and cumulative.svg;\n' +
        'with --sweep sweep.csv and sweep.svg, with --budget budget.csv and budget.svg.\n' +
        'Finished chunks are kept: after Ctrl-C or a crash --resume goes on to the same bytes.',
    );
  addTrialOptions(command, 10_000)
    .option('--within <width>', 'stop when the interval of the yield is no wider', parseShare('--within'))
    .option('--resume', 'go on with an interrupted run')
    .option('--trial <number>', 'write the chip of one trial instead', wholeNumberFor('--trial', 1, 2 ** 31))
    .option(
      '--sweep <quantity=from:to:points>',
      'the yield against one quantity, such as sigma=0.005:0.05:10',
    )
    .option(
      '--budget',
      'what each error source costs, alone and together, and what each correlation changes',
    );
  addChipOptions(command);
  addTargetOptions(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Error sources: sigma (spread of the coupling ratios), sigmaAngle (of the splitter angles), bias, biasSigma (die-wide), pairCorrelation (any two
splitters of a cell), correlationLength (in cells), phaseSigma (radians), bits (of the phases), lossSigmaDb. To sweep also: modes,
couplingRatio (nominal), lossDb (of each splitter).

Examples:
  phasewright yield "haar(8)" --sigma 0.02
  phasewright yield target.npy --chip my.chip.json --threshold fidelity=0.98 --threshold powerDistance=0.05
  phasewright yield "haar(8)" --sweep sigma=0.005:0.05:10 --retune cell
  phasewright yield "haar(8)" --sigma 0.03 --retune refine --threshold fidelity=0.9999 --trials 1000
  phasewright yield "dft(8)" --sigma 0.01 --error phaseSigma=0.02 --error bits=8 --budget`,
    )
    .action(async (argument: string, options: YieldOptions) => {
      setExitCode(await runYield(argument, options));
    });
}

async function runYield(argument: string, options: YieldOptions): Promise<number> {
  refuseTogether(options);
  if (options.sweep !== undefined) return runSweep(argument, options);
  const scenario = await loadScenario(argument, options);
  if (options.budget === true) return runBudget(scenario, options);
  const errors = processOf(scenario.readChip.chip.process, options);
  const thresholds = thresholdsOf(options, scenario.readChip.chip);
  const plan = planOf(scenario, errors, settledPlan(options, scenario.readChip.chip, thresholds));
  const { figures } = plan;
  if (options.trial !== undefined) return replayTrial(scenario, plan, options.trial, options);

  const console = createConsole(options);
  tellMissingPortShifters(console, scenario.readChip.chip, thresholds);
  const folder = options.out ?? yieldFolder(scenario);
  const identity = { ...settledOptions(options), errors, thresholds };
  const runId = runIdentity('yield', scenario.inputs, identity);
  let [judged, passed] = [0, 0];
  const enough = (results: PlanResults): boolean => {
    if (options.within === undefined) return false;
    // Only what has come since the last chunk, or long runs would spend their time counting.
    passed += countPassed(results.rows.subarray(judged * figures.length), figures, thresholds);
    judged = results.trials;
    const { low, high } = clopperPearson(passed, results.trials, options.confidence);
    return high - low <= options.within;
  };
  const files = ['trials.npy', 'histogram.svg', 'cumulative.svg'];
  const kept = {
    console,
    options,
    folder,
    runId,
    files,
    description: describedRun(scenario, identity),
    plans: [plan],
    trials: [options.trials],
    enough,
  };
  return runKept({ ...kept, reportsParts: true }, (outcome) =>
    reportYield({ console, options, scenario, plan, thresholds, outcome, runId, folder }),
  );
}

function refuseTogether({ sweep, budget, trial, within, resume }: YieldOptions): void {
  const modes = { '--sweep': sweep, '--budget': budget, '--trial': trial };
  const given = Object.entries(modes).filter(([, value]) => value !== undefined);
  if (given.length > 1) {
    throw new InputError(
      'usage/yield',
      `${given.map(([name]) => name).join(' and ')} do not go together`,
      'Run them one after the other.',
    );
  }
  if (given.length === 1 && within !== undefined) {
    throw new InputError(
      'usage/yield',
      `--within does not go with ${given[0]![0]}`,
      'Give a number of --trials instead.',
    );
  }
  if (trial !== undefined && resume === true) {
    throw new InputError('usage/yield', 'one trial cannot be resumed', 'Leave out --resume.');
  }
}

interface YieldRun {
  readonly console: Console;
  readonly options: YieldOptions;
  readonly scenario: Scenario;
  readonly plan: TrialPlan;
  readonly thresholds: readonly Threshold[];
  readonly outcome: PlanOutcome;
  readonly runId: string;
  readonly folder: string;
}

async function reportYield(run: YieldRun): Promise<void> {
  const { console, options, scenario, plan, thresholds, outcome, runId, folder } = run;
  const { figures } = plan;
  const results = outcome.results[0]!;
  const share = yieldBlock(results, figures, thresholds, options.confidence);
  const columns = figures.map((_, k) => columnOf(results.rows, figures.length, k));
  columns.forEach((column, k) => requireLight(column, figures[k]!));
  const summaries = figures.map((key, k) =>
    summarise(columns[k]!, {
      confidence: options.confidence,
      worst: isUpperLimit(key) ? 'greatest' : 'least',
    }),
  );
  const theory = infidelityTheory(plan, infidelityWithoutErrors(scenario));
  const files = new Map<string, string | Uint8Array>();
  files.set('trials.npy', npyTable(results.trials, figures.length, results.rows));
  const shown = thresholds[0]!;
  const values = columns[figures.indexOf(shown.key)]!;
  const figure = figureOptions(
    scenario,
    thresholds,
    options.trials === results.trials ? null : results.trials,
  );
  const [{ drawHistogram }, { drawCumulativeCurve }] = await Promise.all([
    import('../figure/drawHistogram.js'),
    import('../figure/drawCumulativeCurve.js'),
  ]);
  files.set('histogram.svg', drawHistogram(values, figure));
  files.set('cumulative.svg', drawCumulativeCurve(values, { ...figure, confidence: options.confidence }));
  await finish(console, options, {
    folder,
    files,
    report: {
      ...reportHead('yield', runId),
      ...scenarioBlocks(scenario),
      errors: plan.errors,
      retune: plan.retune,
      ...refineBlock(plan.refine, [results]),
      yield: { thresholds, ...share },
      ...Object.fromEntries(figures.map((key, k) => [key, summaries[k]])),
      theory: { meanInfidelity: theory?.holds === true ? theory.meanInfidelity : null },
      columns: figures,
      seed: plan.seed,
      clamped: results.clamped,
      ...(outcome.interrupted ? { interrupted: true } : {}),
      seconds: performance.now() / 1000,
      trialsPerSecond: outcome.trialsPerSecond,
    },
    show: () => {
      showYield(run, share, figures, summaries);
      tellTheory(console, summaries[0]!, results.trials, theory);
    },
  });
  tellClamped(console, results.clamped);
  tellOutOfTime(console, plan.refine, [results]);
  const { within } = options;
  if (within !== undefined && !outcome.interrupted && !(share.high - share.low <= within)) {
    console.warning(
      `the interval is ${shortNumber(share.high - share.low)} wide after all ${share.trials} trials, not ${within}: give more --trials`,
    );
  }
}

function tellClamped(console: Console, clamped: number): void {
  if (clamped === 0) return;
  console.warning(
    clamped === 1
      ? 'a coupling ratio was clamped to [0, 1]'
      : `${clamped} coupling ratios were clamped to [0, 1]`,
  );
}

function figureOptions(
  { source, readChip: { chip } }: Scenario,
  thresholds: readonly Threshold[],
  soFar: number | null,
): {
  label: string;
  threshold: number;
  thresholdIsUpperLimit: boolean;
  title: string;
  captionLines: string[];
} {
  const [{ key, limit }] = thresholds as readonly [Threshold];
  const rest = thresholds.slice(1).map(thresholdWords);
  return {
    label: MERIT_NAMES[key],
    threshold: limit,
    thresholdIsUpperLimit: isUpperLimit(key),
    title: chip.name,
    captionLines: [
      `target: ${shownSource(source)}; ${chip.mesh.layout} mesh of ${counted(chip.mesh.modes, 'port')}`,
      ...(rest.length > 0 ? [`judged too, not shown: ${rest.join(', ')}`] : []),
      ...(soFar === null ? [] : [`the first ${soFar} trials`]),
    ],
  };
}

function showYield(
  { console, options, scenario, plan, thresholds }: YieldRun,
  share: ReturnType<typeof yieldBlock>,
  figures: readonly (keyof Merit)[],
  summaries: readonly Summary[],
): void {
  const { chip } = scenario.readChip;
  console.result(
    `${printableText(chip.name)}: ${counted(share.trials, 'sampled chip')} for ${printableText(scenario.source)}, retuning: ${plan.retune}, seed ${plan.seed}\n`,
  );
  console.result(
    `yield ${percent(share.share)} (${percent(share.low)} to ${percent(share.high)} at ${percent(options.confidence)} confidence): ` +
      `${share.passed} of ${share.trials} chips with ${thresholds.map(thresholdWords).join(' and ')}`,
  );
  figures.forEach((key, k) => {
    const { mean, standardError, median, worst } = summaries[k]!;
    const error = standardError === null ? '' : ` \u00b1 ${shortNumber(standardError)}`;
    console.result(
      `${MERIT_NAMES[key]}: mean ${shownMerit(mean)}${error}, median ${shownMerit(median)}, ` +
        `worst ${shownMerit(worst.value)} (trial ${worst.trial})`,
    );
  });
}

/**
 * Says what theory expects, and when simulation is off by more than sampling and the theory's own limits
 * allow.
 */
function tellTheory(
  console: Console,
  { mean, standardError }: Summary,
  trials: number,
  theory: ReturnType<typeof infidelityTheory>,
): void {
  if (theory === null) return;
  if (!theory.holds) {
    console.warning(
      'the errors are too large for the small-error theory, so none stands beside the simulation',
    );
    return;
  }
  const found = 1 - mean;
  const expected = theory.meanInfidelity;
  console.result(`mean infidelity ${shortNumber(found)}, small-error theory ${shortNumber(expected)}`);
  // A single cell's infidelity is as a normal number squared, with a spread of sqrt(2) means, and few trials
  // may well miss its tail.
  const leastError = trials < 1000 ? Math.SQRT2 * (expected / Math.sqrt(trials)) : 0;
  const allowed = 4 * Math.max(standardError ?? 0, leastError) + theory.uncertainty;
  if (Math.abs(found - expected) > allowed) {
    console.warning(
      `theory and simulation differ by ${shortNumber(Math.abs(found - expected))}, more than the ${shortNumber(allowed)} ` +
        'that sampling and higher orders explain: the errors are too large for the small-error theory',
    );
  }
}
