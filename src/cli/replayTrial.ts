import type { ChipFile } from '../chip/chipSchema.js';
import { contentHash, matrixHash, runIdentity } from '../files/contentHash.js';
import { packageVersion } from '../files/version.js';
import { figuresOfMerit } from '../merit/merit.js';
import { freePorts } from '../merit/portPhaseFree.js';
import { formatPhaseJson } from '../program/formatPhaseJson.js';
import { formatPhaseCsv, phaseRows } from '../program/PhaseTable.js';
import { simulate } from '../simulate/simulate.js';
import type { SampledChip } from '../tolerance/createTrialEngine.js';
import { createTrialEngine } from '../tolerance/createTrialEngine.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import { decibelFromPowerRatio } from '../units/decibel.js';
import { createConsole } from './console.js';
import { finish } from './finish.js';
import { chipHash } from './loadChip.js';
import { chipBlock, judge, meritLines, reportHead } from './reportParts.js';
import { thresholdsOf } from './trialOptions.js';
import type { Scenario } from './trialScenario.js';
import type { YieldOptions } from './yieldParts.js';
import { scenarioBlocks, settledOptions, yieldFolder } from './yieldParts.js';

/**
 * Writes the chip of one trial (number from 1) as a chip file of its own, its phases as they really are
 * (errors and resolution included), and what it is worth: `verify` gives the same.
 */
export async function replayTrial(
  scenario: Scenario,
  plan: TrialPlan,
  number: number,
  options: YieldOptions,
): Promise<number> {
  const console = createConsole(options);
  const sampled = createTrialEngine(plan).sample(number - 1);
  const file = chipFileOf(scenario.readChip.file, sampled, plan, number);
  const { chipFromDocument } = await import('../chip/readChip.js');
  const readChip = chipFromDocument(file);
  const { chip } = readChip;
  const { target, settings } = sampled;
  const merit = figuresOfMerit(target, simulate(chip, settings), freePorts(chip));
  const thresholds = thresholdsOf(options, scenario.readChip.chip);
  const judged = judge(thresholds, merit);
  const rows = phaseRows(chip, settings);
  const csv = formatPhaseCsv(rows);
  const json = formatPhaseJson(rows, {
    version: packageVersion(),
    target: { source: scenario.source, matrix: target },
    chip: file,
    options: { trial: number, seed: plan.seed, retune: plan.retune, refine: plan.refine },
    hashes: { target: matrixHash(target), chip: chipHash(readChip), phases: contentHash(csv) },
  });
  const identity = { ...settledOptions(options), errors: plan.errors, thresholds, trial: number };
  await finish(console, options, {
    folder: options.out ?? `${yieldFolder(scenario)}-trial-${number}`,
    files: new Map([
      [`trial-${number}.chip.json`, `${JSON.stringify(file, null, 2)}\n`],
      ['phases.csv', csv],
      ['phases.json', json],
    ]),
    report: {
      ...reportHead('yield', runIdentity('yield', scenario.inputs, identity)),
      ...scenarioBlocks(scenario),
      chip: chipBlock(chip),
      errors: plan.errors,
      retune: plan.retune,
      ...(plan.refine === undefined ? {} : { refine: plan.refine }),
      seed: plan.seed,
      trial: number,
      merit,
      thresholds: judged,
    },
    show: () => {
      console.result(`trial ${number} of seed ${plan.seed}, retuning: ${plan.retune}\n`);
      console.result(meritLines(merit));
      console.result(`\n${judged.every(({ met }) => met) ? 'keeps' : 'does not keep'} the thresholds`);
    },
  });
  if (plan.refine?.mostSeconds !== undefined) {
    console.warning('with --refine-seconds, these phases may differ from those of the trial in a longer run');
  }
  return 0;
}

/**
 * The chip file of a sampled chip: every cell measured, no process any more, and no limits of shifters: these
 * bind what is set, and the phases of a trial are what comes of it.
 */
function chipFileOf(base: ChipFile, { chip }: SampledChip, plan: TrialPlan, number: number): ChipFile {
  const { process, shifterLimits, shifterOverrides = [], ...rest } = base;
  const { couplingRatios, cellLoss, mesh } = chip;
  const { splitters } = chip.style;
  const hasLosses = plan.errors.lossSigmaDb > 0 || plan.chip.cellLoss !== null;
  const names = shifterOverrides.flatMap(({ shifter, name }) =>
    name === undefined ? [] : [{ shifter, name }],
  );
  return {
    ...rest,
    ...(names.length > 0 ? { shifterOverrides: names } : {}),
    name: `${base.name ?? `${mesh.layout} ${mesh.modes}`}, trial ${number}`.slice(0, 200),
    measuredCells: Array.from({ length: mesh.cells }, (_, cell) => {
      // What counts is the loss of all splitters together, and that is all that is kept of it.
      const eachDb = hasLosses ? Math.max(0, -decibelFromPowerRatio(cellLoss![cell]! ** 2) / splitters) : 0;
      return {
        cell: cell + 1,
        couplingRatio: Array.from(couplingRatios.subarray(splitters * cell, splitters * (cell + 1))),
        ...(hasLosses ? { lossDb: new Array<number>(splitters).fill(eachDb) } : {}),
      };
    }),
  };
}
