import { Option } from 'commander';
import type { Command } from 'commander';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import type { Merit } from '../merit/merit.js';
import { MERIT_KEYS } from '../merit/merit.js';
import { LAYOUTS } from '../mesh/Mesh.js';
import type { AngleUnit } from '../units/angle.js';

/** Options that every command has. */
export interface OutputOptions {
  readonly out?: string;
  readonly json?: boolean;
  readonly quiet?: boolean;
  readonly force?: boolean;
  readonly debug?: boolean;
}

/** Options that say which chip is meant. */
export interface ChipOptions {
  readonly chip?: string;
  readonly layout?: (typeof LAYOUTS)[number];
}

/** Options that turn what was read into the target. */
export interface TargetOptions {
  readonly transpose?: boolean;
  readonly conjugate?: boolean;
  readonly ports?: string;
  readonly nearest?: boolean;
  readonly unitaryWithin?: number;
}

export interface UnitOption {
  readonly unit: AngleUnit;
}

/** A figure of merit and the limit that it must keep. */
export interface Requirement {
  readonly key: keyof Merit;
  readonly limit: number;
}

export interface RequireOption {
  readonly require?: readonly Requirement[];
}

export function addOutputOptions(command: Command): Command {
  return command
    .option(
      '--out <folder>',
      'folder for the results (default: out/ and the name of command and input)',
      pathFor('--out'),
    )
    .option('--json', 'print the report as JSON')
    .option('--quiet', 'print nothing but errors, and the report with --json')
    .option('--force', 'replace the results of another run')
    .option('--debug', 'show where in the program an error arose');
}

export function addChipOptions(command: Command): Command {
  return command
    .option('--chip <file>', 'chip file (*.chip.json)', pathFor('--chip'))
    .addOption(
      new Option(
        '--layout <name>',
        'an ideal chip of this layout instead of a chip file (default: rectangular)',
      )
        .choices(LAYOUTS)
        .conflicts('chip'),
    );
}

export function addTargetOptions(command: Command): Command {
  return command
    .option('--transpose', 'the target is written for row vectors: transpose it')
    .option('--conjugate', 'the target is written for fields e^{+i omega t}: conjugate it')
    .option(
      '--ports <range>',
      'put a smaller target on these ports of the chip, such as 3-6, the identity elsewhere',
    )
    .option('--nearest', 'take the nearest unitary matrix, and say how far it is')
    .option(
      '--unitary-within <number>',
      'refuse a target whose max |U^dagger U - I| is larger (default: 1e-6)',
      positiveNumberFor('--unitary-within'),
    );
}

/** The options of the target that change a result. A --require only judges it. */
export function settledTargetOptions(options: TargetOptions): Record<string, unknown> {
  const { transpose, conjugate, ports, nearest, unitaryWithin } = options;
  return { transpose, conjugate, ports, nearest, unitaryWithin };
}

export function addUnitOption(command: Command): Command {
  return command.addOption(
    new Option('--unit <unit>', 'unit of the phases that are printed; files hold radians')
      .choices(['rad', 'pi', 'deg'])
      .default('rad'),
  );
}

export function addRequireOption(command: Command): Command {
  return command.option(
    '--require <figure=limit>',
    'exit with 1 unless this figure of merit is kept, such as fidelity=0.99; may be repeated',
    parseRequirement,
  );
}

/**
 * Reads the number behind an option, for commander. @throws InputError `usage/number` from the reader that it
 * returns
 */
export function numberFor(option: string): (text: string) => number {
  return (text) => {
    const value = text.trim() === '' ? NaN : Number(text);
    if (Number.isFinite(value)) return value;
    throw notANumber(option, text, 'a number');
  };
}

/** The same for a number over 0. */
export function positiveNumberFor(option: string): (text: string) => number {
  return (text) => {
    const value = numberFor(option)(text);
    if (value > 0) return value;
    throw notANumber(option, text, 'a positive number');
  };
}

function notANumber(option: string, text: string, wanted: string): InputError {
  return new InputError(
    'usage/number',
    `${option} ${text}: this is not ${wanted}`,
    'Write a number with a point, such as 4, 0.5 or 1e-6.',
  );
}

/**
 * Reads the path behind an option, for commander: an empty one comes from a shell variable that is not set.
 */
export function pathFor(option: string): (text: string) => string {
  return (text) => {
    if (text !== '') return text;
    throw new InputError(
      'usage/path',
      `${option} is empty`,
      `Write a path behind ${option}, or leave it out.`,
    );
  };
}

function parseRequirement(text: string, earlier: readonly Requirement[] = []): readonly Requirement[] {
  const [, key, limitText] = /^\s*(\w+)\s*=\s*(\S+)\s*$/.exec(text) ?? [];
  const limit = Number(limitText);
  if (key === undefined || !Number.isFinite(limit)) {
    throw new InputError(
      'usage/require',
      `--require ${text}: this is not a figure of merit and a number`,
      'Write for example --require fidelity=0.99',
    );
  }
  const known = MERIT_KEYS.find((name) => name === key);
  if (known === undefined) {
    const near = nearestName(key, MERIT_KEYS);
    throw new InputError(
      'usage/require',
      `--require ${text}: there is no figure of merit ${key}`,
      near === undefined ? `Figures of merit are ${MERIT_KEYS.join(', ')}.` : `Did you mean ${near}?`,
    );
  }
  return [...earlier, { key: known, limit }];
}
