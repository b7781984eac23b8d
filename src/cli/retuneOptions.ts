import type { Command } from 'commander';
import { Option } from 'commander';
import { InputError } from '../errors/InputError.js';
import type { CostFigure } from '../merit/createCost.js';
import { COST_FIGURES } from '../merit/createCost.js';
import type { ReassignedSide } from '../program/reassignPorts.js';
import { REASSIGNED_SIDES } from '../program/reassignPorts.js';
import type { Retuning } from '../program/retunings.js';
import { RETUNINGS } from '../program/retunings.js';
import { parsePortList, parsePorts } from '../target/parsePorts.js';
import { positiveNumberFor } from './commandOptions.js';

/** Options that say how the phases of a chip are found. */
export interface RetuneOptions {
  readonly retune: Retuning;
  /** Indices from 0. */
  readonly inputs?: readonly number[];
  readonly outputs?: readonly number[];
  readonly refineFor?: CostFigure;
  readonly refineSeconds?: number;
  readonly refineIterations?: number;
  readonly reassignPorts?: ReassignedSide;
}

const MOST_ITERATIONS = 1_000_000;

export function addRetuneOptions(command: Command): Command {
  return command
    .addOption(
      new Option(
        '--retune <how>',
        'none: as if all splitters were 50:50; cell: each cell with its own; mesh: later cells make good what ' +
          'earlier ones miss; refine: all phases at once',
      )
        .choices(RETUNINGS)
        .default('cell'),
    )
    .option(
      '--inputs <ports>',
      'refine for light in these inputs of the target only, such as 1,3',
      portsFor('--inputs'),
    )
    .option(
      '--outputs <ports>',
      'refine for these outputs of the target only, such as 2-5',
      portsFor('--outputs'),
    )
    .addOption(
      new Option(
        '--refine-for <figure>',
        'figure that is refined (default: fidelity, or portPhaseFreeFidelity without port shifters)',
      ).choices(COST_FIGURES),
    )
    .option(
      '--refine-seconds <number>',
      'stop refining after so long (default: when nothing is gained any more)',
      positiveNumberFor('--refine-seconds'),
    )
    .option('--refine-iterations <number>', 'stop refining after so many steps (default: 5000)', iterations)
    .addOption(
      new Option(
        '--reassign-ports <side>',
        'exchange ports of the target where the chip then does better; plug the fibres as the report says',
      ).choices(REASSIGNED_SIDES),
    );
}

/** The options that change a result. */
export function settledRetuneOptions(options: RetuneOptions): Record<string, unknown> {
  const { retune, inputs, outputs, refineFor, refineSeconds, refineIterations, reassignPorts } = options;
  return {
    ...(retune === 'cell' ? {} : { retune }),
    ...(inputs ? { inputs: inputs.map((port) => port + 1) } : {}),
    ...(outputs ? { outputs: outputs.map((port) => port + 1) } : {}),
    refineFor,
    refineSeconds,
    refineIterations,
    reassignPorts,
  };
}

/**
 * @throws InputError `usage/retune` for options that mean nothing without --retune refine, `usage/ports` for
 * ports that the target does not have
 */
export function requireSensibleRetuning(
  options: RetuneOptions & { readonly ports?: string },
  modes: number,
): void {
  const { retune, inputs, outputs, refineFor, refineSeconds, refineIterations } = options;
  const [first, last] = options.ports === undefined ? [1, modes] : parsePorts(options.ports);
  const size = last - first + 1;
  if (retune !== 'refine') {
    const given = Object.entries({
      '--inputs': inputs,
      '--outputs': outputs,
      '--refine-for': refineFor,
      '--refine-seconds': refineSeconds,
      '--refine-iterations': refineIterations,
    }).find(([, value]) => value !== undefined);
    if (given === undefined) return;
    throw new InputError(
      'usage/retune',
      `${given[0]} says what is refined, and --retune ${retune} refines nothing`,
      `Add --retune refine, or leave ${given[0]} out.`,
    );
  }
  for (const [option, ports] of [
    ['--inputs', inputs],
    ['--outputs', outputs],
  ] as const) {
    const missing = ports?.find((port) => port >= size);
    if (missing === undefined) continue;
    throw new InputError(
      'usage/ports',
      `${option}: there is no port ${missing + 1}`,
      `The ports of the target are numbered 1 to ${size}, wherever it stands on the chip.`,
    );
  }
}

/**
 * The same options with the chosen ports of the target as ports of the chip: those of a target that --ports puts
 * on some of them count from there.
 */
export function onChipPorts<T extends RetuneOptions & { readonly ports?: string }>(options: T): T {
  if (options.ports === undefined) return options;
  const [first] = parsePorts(options.ports);
  const moved = (ports: readonly number[]): number[] => ports.map((port) => port + first - 1);
  return {
    ...options,
    ...(options.inputs ? { inputs: moved(options.inputs) } : {}),
    ...(options.outputs ? { outputs: moved(options.outputs) } : {}),
  };
}

function portsFor(option: string): (text: string) => readonly number[] {
  return (text) => {
    try {
      return parsePortList(text);
    } catch (error) {
      throw error instanceof InputError ? error.withSource(option) : error;
    }
  };
}

function iterations(text: string): number {
  const value = text.trim() === '' ? NaN : Number(text);
  if (Number.isInteger(value) && value >= 1 && value <= MOST_ITERATIONS) return value;
  throw new InputError(
    'usage/number',
    `--refine-iterations ${text}: this is not a whole number from 1 to ${MOST_ITERATIONS}`,
    'Write for example --refine-iterations 500.',
  );
}
