import type { Command } from 'commander';
import { Option } from 'commander';
import type { ChipFile } from '../chip/chipSchema.js';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import type { drawComparison } from '../figure/drawComparison.js';
import { printableText } from '../figure/printableText.js';
import { runIdentity } from '../files/contentHash.js';
import type { Merit } from '../merit/merit.js';
import type { Layout } from '../mesh/Mesh.js';
import { LAYOUTS } from '../mesh/Mesh.js';
import type { Retuning } from '../program/retunings.js';
import { RETUNINGS } from '../program/retunings.js';
import { trialCost } from '../tolerance/chunking.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { judgedFigures } from '../tolerance/thresholds.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import type { OutputOptions, TargetOptions } from './commandOptions.js';
import { addOutputOptions, addTargetOptions, pathFor, settledTargetOptions } from './commandOptions.js';
import type { Entry, Row, ShownError } from './compareRows.js';
import { compareCsv, compareTable, LEAST_LOSS_DB, rowOf, shownError } from './compareRows.js';
import type { Console } from './console.js';
import { createConsole } from './console.js';
import { shownSource } from './figureText.js';
import { finish } from './finish.js';
import { describedRun, runKept } from './keptRun.js';
import { counted } from './messages.js';
import { reportHead } from './reportParts.js';
import type { PlanOutcome } from './runPlans.js';
import type { SamplingOptions } from './trialOptions.js';
import {
  addSamplingOptions,
  processOf,
  tellMissingPortShifters,
  thresholdsOf,
  trialsNumber,
} from './trialOptions.js';
import { refineBlock, refinementOf, tellOutOfTime } from './trialRefinement.js';
import type { Scenario } from './trialScenario.js';
import { loadScenario, planOf } from './trialScenario.js';
import { scenarioBlocks, thresholdWords, yieldFolder } from './yieldParts.js';

/** The splitters that a cell may have, and what the chip file's cellStyle says of it. */
const CELLS: Readonly<Record<string, ChipFile['cellStyle']>> = { 2: { splitters: 2 }, 3: { splitters: 3 } };

interface CompareOptions extends OutputOptions, TargetOptions, SamplingOptions {
  readonly chip?: string;
  readonly trials?: number;
  readonly layouts: readonly Layout[];
  readonly splitters: readonly string[];
  readonly retunes: readonly Retuning[];
  readonly resume?: boolean;
}

/** Adds the command `compare TARGET`. */
export function addCompareCommand(parent: Command, setExitCode: (code: number) => void): void {
  const cells = Object.keys(CELLS);
  const command = parent
    .command('compare')
    .argument('<target>', 'matrix file, formula, or haar(8) for a new random target in each trial')
    .summary('compare layouts, cells and ways to set them')
    .description(
      'Sample chips in every layout, with every kind of cell and every retuning, and put fidelity, yield, size and loss of\n' +
        'all of them into one table and one figure. All rows share the random numbers.\n' +
        'Writes report.json, compare.csv and compare.svg.\n' +
        'Finished chunks are kept: after Ctrl-C or a crash --resume goes on to the same bytes.',
    )
    .option(
      '--chip <file>',
      'chip file whose style, losses, limits and process all rows have',
      pathFor('--chip'),
    )
    .addOption(listOption('--layouts', 'layouts to compare', LAYOUTS))
    .addOption(listOption('--splitters', 'numbers of splitters of a cell to compare', cells))
    .addOption(listOption('--retunes', 'retunings to compare', RETUNINGS))
    .option(
      '--trials <number>',
      `chips to sample in each row (default: ${USUAL_TRIALS}, fewer where that would take many minutes)`,
      trialsNumber,
    );
  addSamplingOptions(command).option('--resume', 'go on with an interrupted run');
  addTargetOptions(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Retunings: none (one program for all chips), cell (each cell with its own ratios), mesh (what a cell cannot do is made good by later
ones), refine (from there on all phases at once, for the first threshold).
measuredCells and shifterOverrides of the chip file belong to its own layout and cells: they are left out as soon as others are compared.

Examples:
  phasewright compare "haar(8)" --sigma 0.03
  phasewright compare target.npy --chip my.chip.json --threshold fidelity=0.999
  phasewright compare "haar(16)" --sigma 0.02 --layouts rectangular --retunes cell,mesh,refine --trials 300`,
    )
    .action(async (argument: string, options: CompareOptions) => {
      setExitCode(await runCompare(argument, options));
    });
}

const USUAL_TRIALS = 1000;
/** About as much processor time as a row may take when no number of trials is given. */
const ROW_MICROSECONDS = 60e6;
const FEWEST_TRIALS = 50;

interface Comparison {
  readonly console: Console;
  readonly options: CompareOptions;
  readonly scenario: Scenario;
  readonly thresholds: readonly Threshold[];
  readonly figures: readonly (keyof Merit)[];
  readonly entries: readonly Entry[];
  readonly leftOut: readonly string[];
  readonly folder: string;
  readonly runId: string;
}

async function runCompare(argument: string, options: CompareOptions): Promise<number> {
  const console = createConsole(options);
  const scenario = await loadScenario(argument, options);
  const { chip } = scenario.readChip;
  const errors = processOf(chip.process, options);
  const thresholds = thresholdsOf(options, chip);
  tellMissingPortShifters(console, chip, thresholds);
  const figures = [...new Set([...judgedFigures(thresholds), 'transmission' as const])];
  const { chips, leftOut } = await chipsToCompare(scenario, options);
  if (!options.retunes.includes('refine')) refinementOf(options, 'none', chip, thresholds);
  const entries = chips.flatMap((variant) =>
    options.retunes.map((retune): Entry => {
      const limits = retune === 'refine' ? options : {};
      const refine = refinementOf(limits, retune, chip, thresholds);
      const settled = { retune, ...refine, seed: options.seed, figures };
      const plan = { ...planOf(scenario, errors, settled), chip: variant.chip };
      return { ...variant, retune, plan, trials: options.trials ?? usualTrials(plan) };
    }),
  );
  const folder = options.out ?? yieldFolder(scenario, 'compare');
  const identity = { ...settledCompare(options, entries), errors, thresholds };
  const runId = runIdentity('compare', scenario.inputs, identity);
  const comparison = { console, options, scenario, thresholds, figures, entries, leftOut, folder, runId };
  const kept = {
    console,
    command: 'compare',
    options,
    folder,
    runId,
    files: ['compare.csv', 'compare.svg'],
    description: describedRun(scenario, identity),
    plans: entries.map(({ plan }) => plan),
    trials: entries.map(({ trials }) => trials),
    reportsParts: true,
  };
  if (leftOut.length > 0) {
    console.warning(
      `${leftOut.join(' and ')} of the chip file belong to its own layout and cells, and are left out in all rows`,
    );
  }
  return runKept(kept, (outcome) => reportComparison(comparison, outcome));
}

/** The options that change the result, one value each, besides errors and thresholds. */
function settledCompare(options: CompareOptions, entries: readonly Entry[]): Record<string, unknown> {
  const { confidence, seed, layouts, splitters, retunes } = options;
  const refine = entries.find((entry) => entry.plan.refine !== undefined)?.plan.refine;
  return {
    trials: entries.map(({ trials }) => trials).join(' '),
    confidence,
    seed,
    layouts: layouts.join(' '),
    splitters: splitters.join(' '),
    retunes: retunes.join(' '),
    refineIterations: refine?.mostIterations,
    refineSeconds: refine?.mostSeconds,
    ...settledTargetOptions(options),
  };
}

/** A thousand trials, or two digits of what can be done in the time of a row. */
function usualTrials(plan: TrialPlan): number {
  const possible = Number((ROW_MICROSECONDS / trialCost(plan)).toPrecision(2));
  return Math.min(USUAL_TRIALS, Math.max(FEWEST_TRIALS, possible));
}

/** Fields of a chip file that belong to single cells and shifters. */
const OWN_FIELDS = ['measuredCells', 'shifterOverrides'] as const satisfies readonly (keyof ChipFile)[];

/**
 * The chip in every layout and with every kind of cell. What the file says of single cells and shifters holds
 * for no chip but its own, and is left out of all unless only that one is wanted.
 */
async function chipsToCompare(
  { readChip: { file, chip: own } }: Scenario,
  { layouts, splitters }: CompareOptions,
): Promise<{ chips: Pick<Entry, 'layout' | 'splitters' | 'chip'>[]; leftOut: string[] }> {
  const { chipFromDocument } = await import('../chip/readChip.js');
  const { measuredCells: _measured, shifterOverrides: _overrides, ...shared } = file;
  const chips = layouts.flatMap((layout) =>
    splitters.map((count) => {
      const cellStyle = { ...file.cellStyle, ...CELLS[count] };
      const { chip } = chipFromDocument({ ...shared, layout, cellStyle });
      return { layout, splitters: Number(count), chip };
    }),
  );
  const [only] = chips;
  const isOwn =
    chips.length === 1 &&
    only!.layout === own.mesh.layout &&
    JSON.stringify(only!.chip.style) === JSON.stringify(own.style);
  if (isOwn) return { chips: [{ ...only!, chip: own }], leftOut: [] };
  return { chips, leftOut: OWN_FIELDS.filter((field) => file[field] !== undefined) };
}

async function reportComparison(comparison: Comparison, outcome: PlanOutcome): Promise<void> {
  const { console, options, scenario, thresholds, figures, entries, leftOut, folder, runId } = comparison;
  const begun = entries
    .map((entry, k) => ({ entry, results: outcome.results[k]! }))
    .filter(({ results }) => results.trials > 0);
  const judgement = { figures, thresholds, confidence: options.confidence };
  const rows = begun.map((found, k) => rowOf(found, begun[k - 1], judgement));
  const shown = shownError(thresholds, scenario.readChip.chip);
  const { drawComparison } = await import('../figure/drawComparison.js');
  const svg = drawComparison(...figureOf(comparison, rows, shown, outcome.interrupted));
  const refine = entries.find(({ retune }) => retune === 'refine')?.plan.refine;
  const refined = outcome.results.filter((_, k) => entries[k]!.retune === 'refine');
  const { target } = scenarioBlocks(scenario);
  const { name, mesh } = scenario.readChip.chip;
  await finish(console, options, {
    folder,
    files: new Map([
      ['compare.csv', compareCsv(rows, figures)],
      ['compare.svg', svg],
    ]),
    report: {
      ...reportHead('compare', runId),
      target,
      chip: { name: options.chip === undefined ? null : name, modes: mesh.modes, leftOut },
      errors: entries[0]!.plan.errors,
      ...refineBlock(refine, refined),
      thresholds,
      confidence: options.confidence,
      rows: rows.map(({ others, ...row }) => ({ ...row, ...others })),
      seed: options.seed,
      ...(outcome.interrupted ? { interrupted: true } : {}),
      seconds: performance.now() / 1000,
      trialsPerSecond: outcome.trialsPerSecond,
    },
    show: () => {
      console.result(
        `${printableText(scenario.source)} on ${titleOf(comparison)}: share of chips with ${thresholds.map(thresholdWords).join(' and ')}, seed ${options.seed}\n`,
      );
      console.result(compareTable(rows, shown));
    },
  });
  const fewer = rows.filter(({ trials }) => trials < USUAL_TRIALS);
  if (options.trials === undefined && !outcome.interrupted && fewer.length > 0) {
    const least = Math.min(...fewer.map(({ trials }) => trials));
    console.message(
      `${counted(fewer.length, 'row')} of long trials ${fewer.length === 1 ? 'has' : 'have'} fewer of them, at least ${least}: give --trials for another number`,
    );
  }
  tellOutOfTime(console, refine, refined);
}

/** The chip file's name, or what ideal chips of both layouts have in common. */
function titleOf({ options, scenario }: Pick<Comparison, 'options' | 'scenario'>): string {
  const { name, mesh } = scenario.readChip.chip;
  return options.chip === undefined ? `ideal chips of ${counted(mesh.modes, 'port')}` : printableText(name);
}

const RETUNING_NOTE =
  'none: one program for all chips; cell: each cell with its own ratios; mesh: what a cell cannot do is made good by ' +
  'later ones; refine: from there on all phases at once.';

function figureOf(
  comparison: Comparison,
  rows: readonly Row[],
  shown: ShownError,
  interrupted: boolean,
): Parameters<typeof drawComparison> {
  const { options, scenario, thresholds } = comparison;
  const chips = new Map<string, Row[]>();
  for (const row of rows) {
    const key = `${row.layout} ${row.splitters}`;
    chips.set(key, [...(chips.get(key) ?? []), row]);
  }
  const groups = [...chips.values()].map((members) => {
    const { layout, splitters, columns, splitterCount, shifterCount: shifters, transmissionDb } = members[0]!;
    const loss = transmissionDb < -LEAST_LOSS_DB ? [`${(-transmissionDb).toFixed(2)} dB of loss`] : [];
    const sizes = [
      counted(columns, 'column'),
      counted(splitterCount, 'splitter'),
      counted(shifters, 'shifter'),
    ];
    return {
      label: `${layout}, ${counted(splitters, 'splitter')} a cell`,
      facts: [...sizes, ...loss].join(', '),
      rows: members.map((row) => ({
        label: row.retune,
        error: shown.of(row),
        passed: row.passed,
        trials: row.trials,
      })),
    };
  });
  return [
    groups,
    {
      label: `mean ${shown.words}`,
      shareLabel: `chips with ${thresholds.map(thresholdWords).join(' and ')}`,
      confidence: options.confidence,
      notes: [RETUNING_NOTE],
      title: titleOf(comparison),
      captionLines: [
        `target: ${shownSource(scenario.source)}; ${trialsWords(rows)}`,
        ...(interrupted ? ['interrupted: not all rows are whole'] : []),
      ],
    },
  ];
}

/** How many chips the rows have: `1000 chips a row`, or from the fewest to the most. */
function trialsWords(rows: readonly Row[]): string {
  const trials = rows.map((row) => row.trials);
  const [fewest, most] = [Math.min(...trials), Math.max(...trials)];
  return fewest === most ? `${counted(most, 'chip')} a row` : `${fewest} to ${most} chips a row`;
}

/** An option that takes some of the words known, all of them by default. */
function listOption(name: string, description: string, known: readonly string[]): Option {
  return new Option(`${name} <list>`, description)
    .argParser(listOf(name, known))
    .default(known, known.join(','));
}

/**
 * A list of words with commas between, for commander; the words come out in the order of those known.
 * @throws InputError `usage/list` from the reader that it returns
 */
function listOf<Word extends string>(
  option: string,
  known: readonly Word[],
): (text: string) => readonly Word[] {
  return (text) => {
    const words = text.split(',').map((word) => word.trim());
    const strange = words.find((word) => !known.some((name) => name === word));
    if (strange !== undefined) {
      const near = nearestName(strange, known);
      throw new InputError(
        'usage/list',
        `${option} ${text}: there is no ${strange === '' ? 'word between the commas' : strange}`,
        near === undefined ? `Choose from ${known.join(',')}.` : `Did you mean ${near}?`,
      );
    }
    return known.filter((name) => words.includes(name));
  };
}
