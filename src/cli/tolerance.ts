import type { Command } from 'commander';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import { printableText } from '../figure/printableText.js';
import { runIdentity } from '../files/contentHash.js';
import { sensibleWorkers } from '../files/sensibleWorkers.js';
import { INTERRUPTED, withInterrupt } from '../files/withInterrupt.js';
import { requireNoOtherRun } from '../files/writeResults.js';
import { clopperPearson } from '../statistics/binomialInterval.js';
import { normalQuantile } from '../statistics/normalDistribution.js';
import type { ErrorSource } from '../tolerance/errorSources.js';
import { ERROR_SOURCES } from '../tolerance/errorSources.js';
import type { YieldCount } from '../tolerance/findTolerance.js';
import { findFewestBits, findTolerance } from '../tolerance/findTolerance.js';
import { toleranceTheory } from '../tolerance/smallErrorTheory.js';
import { countPassed, judgedFigures } from '../tolerance/thresholds.js';
import type { ChipOptions, OutputOptions, TargetOptions } from './commandOptions.js';
import { addChipOptions, addOutputOptions, addTargetOptions } from './commandOptions.js';
import { createConsole } from './console.js';
import { shownSource } from './figureText.js';
import { finish } from './finish.js';
import { shortNumber } from './messages.js';
import { reportHead } from './reportParts.js';
import { runPlans } from './runPlans.js';
import { textTable } from './textTable.js';
import type { TrialOptions } from './trialOptions.js';
import {
  addTrialOptions,
  parseShare,
  processOf,
  tellMissingPortShifters,
  thresholdsOf,
} from './trialOptions.js';
import { infidelityWithoutErrors, loadScenario, planAt } from './trialScenario.js';
import { QUANTITY_LABELS } from './yieldSweep.js';
import { percent, scenarioBlocks, settledOptions, thresholdWords, yieldFolder } from './yieldParts.js';

interface ToleranceOptions extends OutputOptions, ChipOptions, TargetOptions, TrialOptions {
  readonly source?: string;
  readonly yield: number;
}

/** Sources whose growth makes chips worse, or better for bits, with a value to begin at and the largest that makes sense. */
const SEARCHED: Partial<Record<ErrorSource, readonly [start: number, most: number]>> = {
  sigma: [0.01, 0.5],
  sigmaAngle: [0.01, 0.8],
  biasSigma: [0.01, 0.5],
  bias: [0.01, 0.5],
  phaseSigma: [0.02, 3],
  lossSigmaDb: [0.05, 20],
  pairCorrelation: [0.1, 1],
  bits: [1, 24],
};

/** Adds the command `tolerance TARGET`. */
export function addToleranceCommand(parent: Command, setExitCode: (code: number) => void): void {
  const command = parent
    .command('tolerance')
    .argument('<target>', 'matrix file, formula, or haar(8) for a new random target in each trial')
    .summary('find the error that a design can stand')
    .description(
      'Find the largest value of an error source for which the yield still holds (for bits the fewest), other sources as\n' +
        'the chip file has them.\n' +
        'The same random chips are used at every value; the interval says what the sampling leaves open.',
    )
    .option('--source <name>', `the error source: ${Object.keys(SEARCHED).join(', ')} (default: sigma)`)
    .option('--yield <share>', 'share of good chips wanted', parseShare('--yield'), 0.9);
  addTrialOptions(command, 2000);
  addChipOptions(command);
  addTargetOptions(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Examples:
  phasewright tolerance "haar(8)"
  phasewright tolerance target.npy --chip my.chip.json --source sigma --yield 0.9 --threshold fidelity=0.99
  phasewright tolerance "dft(16)" --source phaseSigma --retune cell --trials 5000`,
    )
    .action(async (argument: string, options: ToleranceOptions) => {
      setExitCode(await runTolerance(argument, options));
    });
}

async function runTolerance(argument: string, options: ToleranceOptions): Promise<number> {
  const console = createConsole(options);
  const source = searchedSource(options.source ?? 'sigma');
  const scenario = await loadScenario(argument, options);
  const thresholds = thresholdsOf(options, scenario.readChip.chip);
  tellMissingPortShifters(console, scenario.readChip.chip, thresholds);
  const figures = judgedFigures(thresholds);
  const errors = { ...processOf(scenario.readChip.chip.process, options, source), [source]: 0 };
  const settled = { retune: options.retune, seed: options.seed, figures };
  const workers = sensibleWorkers(options.workers);
  const folder = options.out ?? yieldFolder(scenario, 'tolerance');
  const identity = { ...settledOptions(options), errors, thresholds, source, yield: options.yield };
  const runId = runIdentity('tolerance', scenario.inputs, identity);
  await requireNoOtherRun({
    folder,
    files: [['tolerance.csv', '']],
    runId,
    command: 'tolerance',
    force: options.force === true,
  });
  const planFor = (value: number): ReturnType<typeof planAt> =>
    planAt(scenario, errors, settled, source, value);
  const [start, most] = SEARCHED[source]!;
  const { value: found } = await withInterrupt((signal) => {
    const count = async (value: number): Promise<YieldCount> => {
      const plan = await planFor(value);
      const outcome = await runPlans({ plans: [plan], trials: options.trials, workers, signal, console });
      signal.throwIfAborted();
      const { rows, trials } = outcome.results[0]!;
      return { passed: countPassed(rows, figures, thresholds), trials };
    };
    const search = { yieldWanted: options.yield, confidence: options.confidence, start, most, count };
    return source === 'bits' ? findFewestBits(search) : findTolerance(search);
  });
  if (found === undefined) {
    console.warning('interrupted before the tolerance was found');
    return INTERRUPTED;
  }
  const onlyFidelity = thresholds.length === 1 && thresholds[0]!.key === 'fidelity';
  const theory = onlyFidelity
    ? toleranceTheory(
        await planFor(start),
        source,
        thresholds[0]!.limit,
        normalQuantile(options.yield),
        infidelityWithoutErrors(scenario),
      )
    : null;
  const points = found.tried.map(({ value, passed, trials }) => ({
    value,
    passed,
    trials,
    share: passed / trials,
    ...clopperPearson(passed, trials, options.confidence),
  }));
  const { drawSweepCurve } = await import('../figure/drawSweepCurve.js');
  const svg = drawSweepCurve(
    points.map(({ value, share, low, high }) => ({ x: value, share, low, high })),
    {
      label: QUANTITY_LABELS[source],
      threshold: thresholds.map(thresholdWords).join(' and '),
      confidence: options.confidence,
      logX: false,
      title: scenario.readChip.chip.name,
      ...(Number.isFinite(found.value)
        ? {
            mark: {
              value: found.value,
              text: `${percent(options.yield)} at ${shortNumber(found.value)} (${bounded(found.low, most)} to ${bounded(found.high, most)})`,
            },
          }
        : {}),
      captionLines: [
        `target: ${shownSource(scenario.source)}; ${options.trials} chips at each value; retuning: ${options.retune}`,
      ],
    },
  );
  const csv = ['value,passed,trials,share,low,high']
    .concat(
      points.map((point) =>
        [point.value, point.passed, point.trials, point.share, point.low, point.high].join(','),
      ),
    )
    .join('\n');
  const reported = (value: number): number | null => (Number.isFinite(value) ? value : null);
  await finish(console, options, {
    folder,
    files: new Map([
      ['tolerance.csv', `${csv}\n`],
      ['tolerance.svg', svg],
    ]),
    report: {
      ...reportHead('tolerance', runId),
      ...scenarioBlocks(scenario),
      errors,
      retune: options.retune,
      thresholds,
      tolerance: {
        source,
        value: reported(found.value),
        low: reported(found.low),
        high: reported(found.high),
        yield: options.yield,
        confidence: options.confidence,
        largestTried: most,
      },
      theory: { value: theory },
      tried: points,
      seed: options.seed,
      seconds: performance.now() / 1000,
    },
    show: () => {
      console.result(
        `${printableText(scenario.source)} on ${printableText(scenario.readChip.chip.name)}: a yield of ${percent(options.yield)} ` +
          `with ${thresholds.map(thresholdWords).join(' and ')} holds ${source === 'bits' ? 'from' : 'up to'}\n`,
      );
      console.result(
        textTable(
          ['source', 'value', 'low', 'high', ...(theory === null ? [] : ['theory'])],
          [
            [
              source,
              bounded(found.value, most),
              bounded(found.low, most),
              bounded(found.high, most),
              ...(theory === null ? [] : [shortNumber(theory)]),
            ],
          ],
        ),
      );
      console.result(
        `\n${options.trials} chips at each of ${points.length} values, retuning: ${options.retune}, seed ${options.seed}`,
      );
    },
  });
  if (found.value === 0) console.warning(`the yield does not hold even without ${source}`);
  return 0;
}

function bounded(value: number, most: number): string {
  return value === Infinity ? `over ${most}` : shortNumber(value);
}

function searchedSource(name: string): ErrorSource {
  const names = Object.keys(SEARCHED) as ErrorSource[];
  const known = names.find((source) => source === name);
  if (known !== undefined) return known;
  // A source that is there, but not to be searched, is no slip of the pen for another one.
  const near = ERROR_SOURCES.some((source) => source === name) ? undefined : nearestName(name, names);
  throw new InputError(
    'usage/source',
    `no tolerance is found for ${name}`,
    near === undefined ? `Sources are ${names.join(', ')}.` : `Did you mean ${near}?`,
  );
}
