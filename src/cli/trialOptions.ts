import { Option } from 'commander';
import type { Command } from 'commander';
import type { Chip, ProcessErrors } from '../chip/Chip.js';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import { judgedFigure } from '../merit/judgedFidelity.js';
import type { Merit } from '../merit/merit.js';
import { isUpperLimit, MERIT_KEYS } from '../merit/merit.js';
import type { ErrorSource } from '../tolerance/errorSources.js';
import {
  ERROR_SOURCES,
  errorSource,
  hasErrors,
  requireConsistent,
  withSource,
} from '../tolerance/errorSources.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { positiveNumberFor } from './commandOptions.js';
import type { Console } from './console.js';
import { USUAL_ITERATIONS } from '../tolerance/TrialPlan.js';
import type { Retuning } from '../program/retunings.js';
import { RETUNINGS } from '../program/retunings.js';

/** Options of the commands that sample chips in one way or several. */
export interface SamplingOptions {
  readonly threshold?: readonly Threshold[];
  readonly confidence: number;
  readonly refineIterations?: number;
  readonly refineSeconds?: number;
  readonly sigma?: number;
  readonly error?: readonly (readonly [ErrorSource, number])[];
  readonly seed: number;
  readonly workers?: number;
}

/** Options of the commands that sample chips. */
export interface TrialOptions extends SamplingOptions {
  readonly trials: number;
  readonly retune: Retuning;
}

/** The seed when none is given: any fixed number would do. */
const USUAL_SEED = 2026;
const MOST_TRIALS = 100_000_000;

const MOST_ITERATIONS = 1_000_000;

export function addTrialOptions(command: Command, usualTrials: number): Command {
  command
    .option('--trials <number>', 'chips to sample', trialsNumber, usualTrials)
    .addOption(
      new Option(
        '--retune <how>',
        'none: one program for all chips; cell: each corrected cell by cell with its own ratios; mesh: what a cell ' +
          'cannot do is made good by later ones; refine: from there on all phases at once',
      )
        .choices(RETUNINGS)
        .default('none'),
    );
  return addSamplingOptions(command);
}

/** A number of trials, for commander. @throws InputError `usage/number` */
export const trialsNumber = wholeNumberFor('--trials', 1, MOST_TRIALS);

/** All options of sampling but how often and with which retuning. */
export function addSamplingOptions(command: Command): Command {
  return command
    .option(
      '--threshold <figure=limit>',
      'what makes a chip good; several must all hold (default: fidelity=0.99, portPhaseFreeFidelity=0.99 without port shifters)',
      parseThreshold,
    )
    .option('--confidence <share>', 'confidence of all intervals', parseShare('--confidence'), 0.95)
    .option(
      '--refine-iterations <number>',
      `iterations of refine for each chip (default: ${USUAL_ITERATIONS})`,
      wholeNumberFor('--refine-iterations', 1, MOST_ITERATIONS),
    )
    .option(
      '--refine-seconds <number>',
      'time of refine for each chip besides; where it runs out, results depend on the machine',
      positiveNumberFor('--refine-seconds'),
    )
    .option('--sigma <spread>', 'independent normal error of every coupling ratio', realNumber('--sigma'))
    .option(
      '--error <source=value>',
      "set an error source of the chip file's process block, such as bits=8; may be repeated",
      parseError,
    )
    .option(
      '--seed <number>',
      'seed of the random numbers',
      wholeNumberFor('--seed', 0, Number.MAX_SAFE_INTEGER),
      USUAL_SEED,
    )
    .option(
      '--workers <number>',
      'worker threads (default: one per core); results do not depend on it',
      realNumber('--workers'),
    );
}

/** The thresholds in force; by default 0.99 of the fidelity that means something for the chip. */
export function thresholdsOf(
  { threshold }: { readonly threshold?: readonly Threshold[] },
  chip: Chip,
): readonly Threshold[] {
  return threshold ?? [{ key: judgedFigure(chip), limit: 0.99 }];
}

/** Says so when thresholds look at phases that the chip cannot set. */
export function tellMissingPortShifters(
  console: Console,
  chip: Chip,
  thresholds: readonly Threshold[],
): void {
  if (chip.portShifters || !thresholds.some(({ key }) => key === 'fidelity')) return;
  console.warning(
    'this chip has no port shifters, so its fidelity is a matter of chance: judge portPhaseFreeFidelity instead',
  );
}

/**
 * The process of the chip file with the sources of the command line.
 * @param swept a source that will get its values later, so that it need not be there yet
 * @throws InputError `process/none` when nothing makes chips differ
 */
export function processOf(
  inFile: ProcessErrors,
  { sigma, error = [] }: Pick<SamplingOptions, 'sigma' | 'error'>,
  swept?: string,
): ProcessErrors {
  const given =
    sigma === undefined ? error.map(([source]) => source) : ['sigma', ...error.map(([source]) => source)];
  if (swept !== undefined && given.includes(swept)) {
    throw new InputError(
      'usage/swept',
      `${swept} takes many values in this run, and one is given for it`,
      `Leave out ${swept === 'sigma' && sigma !== undefined ? '--sigma' : `--error ${swept}=...`}.`,
    );
  }
  let errors = inFile;
  if (sigma !== undefined) errors = withSource(errors, 'sigma', sigma);
  for (const [source, value] of error) errors = withSource(errors, source, value);
  const sweptIsSource = ERROR_SOURCES.some((source) => source === swept);
  if (!sweptIsSource) {
    if (!hasErrors(errors)) {
      throw new InputError(
        'process/none',
        'nothing makes the chips differ: there is no error source',
        'Give --sigma 0.02, --error SOURCE=VALUE, or a process block in the chip file.',
      );
    }
    requireConsistent(errors);
  }
  return errors;
}

function parseError(
  text: string,
  earlier: readonly (readonly [ErrorSource, number])[] = [],
): readonly (readonly [ErrorSource, number])[] {
  const [name, value] = assignment('--error', text, '--error bits=8');
  return [...earlier, [errorSource(name), value]];
}

function parseThreshold(text: string, earlier: readonly Threshold[] = []): readonly Threshold[] {
  const [name, limit] = assignment('--threshold', text, '--threshold fidelity=0.99');
  const key = MERIT_KEYS.find((known) => known === name);
  if (key === undefined) {
    const near = nearestName(name, MERIT_KEYS);
    throw new InputError(
      'usage/threshold',
      `--threshold ${text}: there is no figure of merit ${name}`,
      near === undefined ? `Figures of merit are ${MERIT_KEYS.join(', ')}.` : `Did you mean ${near}?`,
    );
  }
  requirePossible(key, limit, text);
  return [...earlier, { key, limit }];
}

/** A threshold that no chip, or every chip, keeps is a slip of the pen. */
function requirePossible(key: keyof Merit, limit: number, text: string): void {
  if (key !== 'transmissionDb' && !isUpperLimit(key) && limit < 0) {
    throw new InputError(
      'usage/threshold',
      `--threshold ${text}: every chip keeps that`,
      `${key} is a number from 0 to 1.`,
    );
  }
  const impossible = key === 'transmissionDb' ? limit > 0 : isUpperLimit(key) ? limit < 0 : limit > 1;
  if (!impossible) return;
  throw new InputError(
    'usage/threshold',
    `--threshold ${text}: no chip can keep that`,
    isUpperLimit(key)
      ? `${key} is an error, and 0 at best.`
      : `${key} is ${key === 'transmissionDb' ? 0 : 1} at best.`,
  );
}

/** `name=number`. @throws InputError `usage/assignment` */
export function assignment(option: string, text: string, example: string): [name: string, value: number] {
  const [, name, valueText] = /^\s*(\w+)\s*=\s*(\S+)\s*$/.exec(text) ?? [];
  const value = Number(valueText);
  if (name === undefined || !Number.isFinite(value)) {
    throw new InputError(
      'usage/assignment',
      `${option} ${text}: this is not a name and a number`,
      `Write for example ${example}`,
    );
  }
  return [name, value];
}

/** A whole number within limits, for commander. @throws InputError `usage/number` */
export function wholeNumberFor(option: string, low: number, high: number): (text: string) => number {
  return (text) => {
    const value = Number(text);
    if (text.trim() !== '' && Number.isSafeInteger(value) && value >= low && value <= high) return value;
    throw new InputError(
      'usage/number',
      `${option} ${text}: this number cannot be`,
      `Give a whole number from ${low} to ${high}.`,
    );
  };
}

/** A share between 0 and 1, both excluded, for commander. @throws InputError `usage/number` */
export function parseShare(option: string): (text: string) => number {
  return (text) => {
    const value = Number(text);
    if (text.trim() !== '' && value > 0 && value < 1) return value;
    throw new InputError(
      'usage/number',
      `${option} ${text}: this is not a share between 0 and 1`,
      `Write for example ${option} 0.95`,
    );
  };
}

/**
 * Any finite number, for commander; its limits are checked where it is used. @throws InputError
 * `usage/number`
 */
export function realNumber(option: string): (text: string) => number {
  return (text) => {
    const value = Number(text);
    if (text.trim() !== '' && Number.isFinite(value)) return value;
    throw new InputError(
      'usage/number',
      `${option} ${text}: this is not a number`,
      `Write for example ${option} 0.02`,
    );
  };
}
