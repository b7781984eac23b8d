import type { ProcessErrors } from '../chip/Chip.js';
import type { ChipFile } from '../chip/chipSchema.js';
import type { ReadChip } from '../chip/readChip.js';
import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { haarUnitary } from '../matrix/haar.js';
import { simulate } from '../simulate/simulate.js';
import { programChip } from '../program/programChip.js';
import { figuresOfMerit } from '../merit/merit.js';
import type { ErrorSource } from '../tolerance/errorSources.js';
import {
  ERROR_SOURCES,
  requireConsistent,
  requirePossibleCorrelation,
  withSource,
} from '../tolerance/errorSources.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import { matrixFileKind } from '../target/MatrixFileKind.js';
import type { ChipOptions, TargetOptions } from './commandOptions.js';
import { chipHash, idealChipFor, loadNamedChip } from './loadChip.js';
import type { LoadedTarget, RawTarget } from './loadTarget.js';
import { prepareLoaded, rawTargetHash, readTarget, theOnlyMatrix } from './loadTarget.js';

/** Quantities of the design that may be swept, beside the error sources. */
export const DESIGN_QUANTITIES = ['modes', 'couplingRatio', 'lossDb'] as const;
export type DesignQuantity = (typeof DESIGN_QUANTITIES)[number];
/** What a sweep runs over. */
export type Quantity = ErrorSource | DesignQuantity;
export const QUANTITIES: readonly Quantity[] = [...ERROR_SOURCES, ...DESIGN_QUANTITIES];

/** A chip and a target, and how both change with a quantity. */
export interface Scenario {
  /** As the user named the target. */
  readonly source: string;
  readonly path?: string;
  readonly readChip: ReadChip;
  /** The target, or null for a new Haar-random one in each trial. */
  readonly target: LoadedTarget | null;
  /** Content hashes for the run's identity. */
  readonly inputs: Readonly<Record<string, string>>;
  /** The same with the design quantity at another value. */
  at(quantity: DesignQuantity, value: number): Promise<Scenario>;
}

/** `haar(8)`: a target for each trial. `haar(8, 1)` has a seed and is one matrix. */
const HAAR_EACH_TRIAL = /^\s*haar\s*\(\s*(\d+|N)\s*\)\s*$/;
/** The number of ports, where a formula leaves it open. */
const OPEN_MODES = /\bN\b/;

/**
 * Reads target and chip of a command that samples chips. A formula may leave the number of ports open as `N`,
 * to be swept, or taken from the chip.
 * @param modes number of ports for a formula with `N` when no chip is named
 */
export async function loadScenario(
  argument: string,
  options: ChipOptions & TargetOptions,
  modes?: number,
): Promise<Scenario> {
  const namedChip = await loadNamedChip(options);
  const ports = namedChip?.chip.mesh.modes ?? modes;
  const each = HAAR_EACH_TRIAL.test(argument);
  const raw = each ? null : await readTarget(withModes(argument, ports));
  return scenarioOf(argument, options, namedChip, ports, raw);
}

/** The scenario of a target that has been read (null: a new random one in each trial). */
async function scenarioOf(
  argument: string,
  options: ChipOptions & TargetOptions,
  namedChip: ReadChip | undefined,
  ports: number | undefined,
  raw: RawTarget | null,
): Promise<Scenario> {
  const each = HAAR_EACH_TRIAL.exec(argument)?.[1];
  const own = raw !== null ? theOnlyMatrix(raw).rows : each === 'N' ? ports : Number(each);
  if (own === undefined) throw openModes(argument);
  const readChip = namedChip ?? (await idealChipFor(requirePorts(own), options));
  const chipModes = readChip.chip.mesh.modes;
  if (raw === null && own !== chipModes) {
    throw new InputError(
      'target/size',
      `the targets have ${own} ports, the chip ${chipModes}`,
      'Give both the same number of ports.',
      {
        source: argument,
      },
    );
  }
  const target = raw && prepareLoaded(raw, theOnlyMatrix(raw), options, namedChip ? chipModes : undefined);
  return {
    source: argument === '-' ? raw!.source : argument,
    ...(raw?.path === undefined ? {} : { path: raw.path }),
    readChip,
    target,
    inputs: { target: raw ? rawTargetHash(raw) : argument, chip: chipHash(readChip) },
    at: async (quantity, value) => {
      if (quantity !== 'modes') {
        const chip = await changedChip(readChip.file, quantity, value);
        return scenarioOf(argument, options, chip, ports, raw);
      }
      if (raw !== null && (raw.path !== undefined || !OPEN_MODES.test(argument))) throw fixedModes(argument);
      const chip = namedChip && (await changedChip(namedChip.file, 'modes', value));
      if (raw === null) return scenarioOf('haar(N)', options, chip, value, null);
      return scenarioOf(argument, options, chip, value, await readTarget(withModes(argument, value)));
    },
  };
}

/**
 * The plan of trials of a scenario.
 * @throws InputError for a correlation that the splitters of its cells cannot have
 */
export function planOf(
  { readChip, target }: Scenario,
  errors: ProcessErrors,
  settled: Pick<TrialPlan, 'retune' | 'refine' | 'seed' | 'figures'>,
): TrialPlan {
  requirePossibleCorrelation(errors, readChip.chip.style);
  return { chip: readChip.chip, target: target === null ? 'haar' : target.matrix, errors, ...settled };
}

/** The plan with a quantity at a value: an error source, or a design quantity. */
export async function planAt(
  scenario: Scenario,
  errors: ProcessErrors,
  settled: Parameters<typeof planOf>[2],
  quantity: Quantity,
  value: number,
): Promise<TrialPlan> {
  const source = ERROR_SOURCES.find((known) => known === quantity);
  if (source === undefined)
    return planOf(await scenario.at(quantity as DesignQuantity, value), errors, settled);
  const changed = withSource(errors, source, value);
  requireConsistent(changed);
  return planOf(scenario, changed, settled);
}

/** Targets on which a chip is tried that is to do any target. */
const HAAR_TRIED = 8;
const FLAWLESS = 1e-9;

/**
 * 1 - F of the chip as it stands, without errors. For Haar-random targets 0 on a chip without flaws, and null
 * on any other one, where it is different from target to target.
 */
export function infidelityWithoutErrors({ readChip: { chip }, target }: Scenario): number | null {
  const infidelity = (matrix: ComplexMatrix): number => {
    const { settings } = programChip(chip, matrix).program;
    return Math.max(0, 1 - figuresOfMerit(matrix, simulate(chip, settings)).fidelity);
  };
  if (target !== null) return infidelity(target.matrix);
  if (!chip.couplingRatios.every((ratio) => ratio === 0.5)) return null;
  for (let seed = 1; seed <= HAAR_TRIED; seed++) {
    if (!(infidelity(haarUnitary(chip.mesh.modes, seed)) < FLAWLESS)) return null;
  }
  return 0;
}

async function changedChip(file: ChipFile, quantity: DesignQuantity, value: number): Promise<ReadChip> {
  const { chipFromDocument } = await import('../chip/readChip.js');
  if (quantity === 'couplingRatio') {
    if (file.measuredCells !== undefined) {
      throw new InputError(
        'usage/sweep',
        'the chip has measuredCells, whose ratios take the place of the nominal one',
        'Give a chip file without them, or take bias instead.',
      );
    }
    return chipFromDocument({ ...file, couplingRatio: value });
  }
  if (quantity === 'lossDb')
    return chipFromDocument({ ...file, lossDb: { ...file.lossDb, splitter: value } });
  for (const key of ['measuredCells', 'shifterOverrides', 'portNames'] as const) {
    if (file[key] !== undefined) {
      throw new InputError(
        'usage/sweep',
        `the chip has ${key}, which belong to ${file.modes} ports`,
        'Give --layout instead, or a chip file that lists nothing port by port or cell by cell.',
      );
    }
  }
  return chipFromDocument({ ...file, modes: value });
}

function requirePorts(modes: number): number {
  if (modes >= 1 && modes <= 1024) return modes;
  throw new InputError('target/size', `${modes} ports`, 'Give from 1 to 1024 ports.');
}

/** A formula with the number of ports put in; names of files stay as they are. */
function withModes(argument: string, modes: number | undefined): string {
  if (!OPEN_MODES.test(argument) || matrixFileKind(argument) !== undefined) return argument;
  if (modes === undefined) throw openModes(argument);
  return argument.replaceAll(new RegExp(OPEN_MODES, 'g'), String(modes));
}

function openModes(argument: string): InputError {
  return new InputError(
    'usage/modes',
    `the number of ports N of ${argument} is not known`,
    'Write a number for it, name a chip with --chip, or vary it: --sweep modes=4:16:7, tolerance --source modes.',
  );
}

function fixedModes(argument: string): InputError {
  return new InputError(
    'usage/sweep',
    `the number of ports of ${argument} is fixed`,
    'Write N for it, such as haar(N) or dft(N), to vary modes.',
  );
}
