import { printableText } from '../figure/printableText.js';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import { runIdentity } from '../files/contentHash.js';
import { summarise } from '../statistics/summary.js';
import { columnOf } from '../tolerance/thresholds.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import { createConsole } from './console.js';
import { shownSource } from './figureText.js';
import { finish } from './finish.js';
import { describedRun, runKept } from './keptRun.js';
import { reportHead } from './reportParts.js';
import { textTable } from './textTable.js';
import { processOf, tellMissingPortShifters, thresholdsOf } from './trialOptions.js';
import { refineBlock, settledPlan, tellOutOfTime } from './trialRefinement.js';
import type { Quantity } from './trialScenario.js';
import { loadScenario, planAt, QUANTITIES } from './trialScenario.js';
import type { YieldOptions } from './yieldParts.js';
import {
  percent,
  scenarioBlocks,
  settledOptions,
  thresholdWords,
  yieldBlock,
  yieldFolder,
} from './yieldParts.js';

/** A quantity and the values that it takes. */
interface Sweep {
  readonly quantity: Quantity;
  readonly values: readonly number[];
}

const MOST_POINTS = 1000;

/** Words for the axis of a quantity. */
export const QUANTITY_LABELS: Readonly<Record<Quantity, string>> = {
  sigma: 'spread of the coupling ratio',
  sigmaAngle: 'spread of the splitter angle (rad)',
  bias: 'bias of the coupling ratio',
  biasSigma: 'die-wide spread of the coupling ratio',
  pairCorrelation: 'correlation of any two splitters of a cell',
  correlationLength: 'correlation length (cells)',
  phaseSigma: 'spread of the phases (rad)',
  bits: 'bits of the phases',
  lossSigmaDb: 'spread of the splitter loss (dB)',
  modes: 'number of ports',
  couplingRatio: 'nominal coupling ratio',
  lossDb: 'splitter loss (dB)',
};

/** `yield --sweep`: the yield against one quantity, as CSV and curve. */
export async function runSweep(argument: string, options: YieldOptions): Promise<number> {
  const console = createConsole(options);
  const { quantity, values } = parseSweep(options.sweep!);
  const scenario = await loadScenario(argument, options, quantity === 'modes' ? values[0] : undefined);
  const thresholds = thresholdsOf(options, scenario.readChip.chip);
  tellMissingPortShifters(console, scenario.readChip.chip, thresholds);
  const errors = processOf(scenario.readChip.chip.process, options, quantity);
  const settled = settledPlan(options, scenario.readChip.chip, thresholds);
  const { figures } = settled;
  const plans: TrialPlan[] = [];
  for (const value of values) plans.push(await planAt(scenario, errors, settled, quantity, value));
  const folder = options.out ?? `${yieldFolder(scenario)}-sweep-${quantity}`;
  const identity = { ...settledOptions(options), errors, thresholds, sweep: { quantity, values } };
  const runId = runIdentity('yield', scenario.inputs, identity);
  const kept = {
    console,
    options,
    folder,
    runId,
    files: ['sweep.csv', 'sweep.svg'],
    description: describedRun(scenario, identity),
    plans,
    trials: plans.map(() => options.trials),
  };
  return runKept({ ...kept, reportsParts: true }, async (outcome) => {
    const points = outcome.results
      .map((results, k) => ({ results, value: values[k]! }))
      .filter(({ results }) => results.trials > 0)
      .map(({ results, value }) => {
        const fidelity = summarise(columnOf(results.rows, figures.length, 0), {
          confidence: options.confidence,
        });
        const { mean, standardError } = fidelity;
        return {
          value,
          ...yieldBlock(results, figures, thresholds, options.confidence),
          fidelity: { mean, standardError },
          clamped: results.clamped,
        };
      });
    const header = [
      quantity,
      'passed',
      'trials',
      'share',
      'low',
      'high',
      'fidelityMean',
      'fidelityStandardError',
    ];
    const table = points.map(({ value, passed, trials, share, low, high, fidelity }) =>
      [value, passed, trials, share, low, high, fidelity.mean, fidelity.standardError ?? ''].map(String),
    );
    const { drawSweepCurve } = await import('../figure/drawSweepCurve.js');
    const { chip } = scenario.readChip;
    const svg = drawSweepCurve(
      points.map(({ value, share, low, high, fidelity }) => ({
        x: value,
        share,
        low,
        high,
        mean: fidelity.mean,
      })),
      {
        label: QUANTITY_LABELS[quantity],
        threshold: thresholds.map(thresholdWords).join(' and '),
        confidence: options.confidence,
        title: quantity === 'modes' ? `${chip.mesh.layout} meshes` : chip.name,
        captionLines: [
          `target: ${shownSource(scenario.source)}; ${options.trials} chips at each point; retuning: ${options.retune}`,
          ...(outcome.interrupted ? [`interrupted: ${points.at(-1)!.trials} chips at the last point`] : []),
        ],
        // The points of a sweep are evenly spaced, and so they shall stand.
        logX: false,
      },
    );
    await finish(console, options, {
      folder,
      files: new Map([
        ['sweep.csv', `${[header, ...table].map((row) => row.join(',')).join('\n')}\n`],
        ['sweep.svg', svg],
      ]),
      report: {
        ...reportHead('yield', runId),
        ...scenarioBlocks(scenario),
        errors,
        retune: options.retune,
        ...refineBlock(settled.refine, outcome.results),
        thresholds,
        quantity,
        sweep: points,
        seed: options.seed,
        ...(outcome.interrupted ? { interrupted: true } : {}),
        seconds: performance.now() / 1000,
        trialsPerSecond: outcome.trialsPerSecond,
      },
      show: () => {
        console.result(
          `${printableText(scenario.source)}: share of chips with ${thresholds.map(thresholdWords).join(' and ')}, seed ${options.seed}\n`,
        );
        console.result(
          textTable(
            [quantity, 'yield', 'low', 'high', 'mean fidelity'],
            points.map(({ value, share, low, high, fidelity }) => [
              String(Number(value.toPrecision(6))),
              percent(share),
              percent(low),
              percent(high),
              fidelity.mean.toFixed(6),
            ]),
          ),
        );
      },
    });
    tellOutOfTime(console, settled.refine, outcome.results);
  });
}

/** `sigma=0.005:0.05:10`: from, to, and how many points, ends included. */
function parseSweep(text: string): Sweep {
  const [, name, fromText, toText, countText] =
    /^\s*(\w+)\s*=\s*([^:\s]+):([^:\s]+):([^:\s]+)\s*$/.exec(text) ?? [];
  const [from, to, count] = [Number(fromText), Number(toText), Number(countText)];
  if (name === undefined || !Number.isFinite(from) || !Number.isFinite(to)) {
    throw new InputError(
      'usage/sweep',
      `--sweep ${text}: this is not a quantity with a range`,
      'Write for example --sweep sigma=0.005:0.05:10',
    );
  }
  const quantity = QUANTITIES.find((known) => known === name);
  if (quantity === undefined) {
    const near = nearestName(name, QUANTITIES);
    throw new InputError(
      'usage/sweep',
      `--sweep ${text}: there is no quantity ${name}`,
      near === undefined ? `Quantities are ${QUANTITIES.join(', ')}.` : `Did you mean ${near}?`,
    );
  }
  if (!(Number.isInteger(count) && count >= 1 && count <= MOST_POINTS)) {
    throw new InputError(
      'usage/sweep',
      `--sweep ${text}: ${countText} points`,
      `Give from 1 to ${MOST_POINTS} points.`,
    );
  }
  const whole = quantity === 'modes' || quantity === 'bits';
  const values = Array.from({ length: count }, (_, k) => {
    const value = count === 1 ? from : from + ((to - from) * k) / (count - 1);
    // Steps of 0.005 shall read 0.015, not 0.015000000000000001.
    return whole ? Math.round(value) : Number(value.toPrecision(12));
  });
  return { quantity, values: [...new Set(values)] };
}
