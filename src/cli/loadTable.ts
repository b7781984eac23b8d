import { existsSync } from 'node:fs';
import { basename } from 'node:path';
import { InputError } from '../errors/InputError.js';
import type { ReadChip } from '../chip/readChip.js';
import type { Settings } from '../chip/Settings.js';
import { contentHash } from '../files/contentHash.js';
import { readInputFile } from '../files/readInput.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Merit } from '../merit/merit.js';
import { figuresOfMerit } from '../merit/merit.js';
import { freePorts } from '../merit/portPhaseFree.js';
import type { OutOfRange } from '../program/carryingSweep.js';
import { limitSettings } from '../program/limitSettings.js';
import type { PhaseRow } from '../program/PhaseTable.js';
import { readPhaseTable } from '../program/readPhaseTable.js';
import { settingsFromRows } from '../program/settingsFromRows.js';
import { simulate } from '../simulate/simulate.js';
import type { ChipOptions, TargetOptions } from './commandOptions.js';
import { idealChipFor, loadNamedChip } from './loadChip.js';
import { named, prepareLoaded, readTarget, theOnlyMatrix } from './loadTarget.js';

/** Options that serve a lone CSV, or replace what the JSON beside it says. */
export interface TableOptions extends ChipOptions, TargetOptions {
  readonly target?: string;
}

/** The target of a table: from the JSON beside it, or from the options. */
export interface TableTarget {
  readonly source: string;
  readonly matrix: ComplexMatrix;
  readonly unitarityDefect: number | null;
  readonly nearestDistance: number | null;
}

/** A phase table with the chip that it is for and, where known, its target. */
export interface LoadedTable {
  readonly path: string;
  readonly rows: readonly PhaseRow[];
  /** The table's phases as the chip can set them. */
  readonly settings: Settings;
  /** The phases that it cannot set as they stand. */
  readonly outOfRange: readonly OutOfRange[];
  readonly readChip: ReadChip;
  readonly target: TableTarget | null;
  /** What the chip then does. */
  readonly achieved: ComplexMatrix;
  /** How well, where the target is known. */
  readonly merit: Merit | null;
  /** Content hash of the phases. */
  readonly hash: string;
}

/**
 * Reads an argument TABLE. A CSV uses the JSON of the same name beside it for chip and target; its own phases
 * win. --chip, --layout and --target come before what the JSON says.
 * @throws InputError when the chip is not known, or the table is not of it
 */
export async function loadTable(path: string, options: TableOptions): Promise<LoadedTable> {
  const bytes = await readInputFile(path);
  const table = named(path, () => readPhaseTable(bytes));
  refuseTargetOptions(options);
  const origin = table.origin ?? (await originBeside(path));
  const given = options.target === undefined ? undefined : await readTarget(options.target);
  const namedChip = await loadNamedChip(options);
  let readChip = namedChip ?? (options.layout === undefined ? origin?.chip : undefined);
  if (readChip === undefined) {
    const modes = given ? theOnlyMatrix(given).rows : origin?.target.rows;
    if (modes === undefined) throw chipUnknown(path);
    readChip = await idealChipFor(modes, options);
  }
  const { chip } = readChip;
  let target: TableTarget | null = null;
  if (given) {
    target = prepareLoaded(given, theOnlyMatrix(given), options, chip.mesh.modes);
  } else if (origin) {
    target = {
      source: origin.targetSource,
      matrix: origin.target,
      unitarityDefect: null,
      nearestDistance: null,
    };
    if (target.matrix.rows !== chip.mesh.modes) {
      throw new InputError(
        'table/size',
        `the table's target has ${target.matrix.rows} ports, the chip ${chip.mesh.modes}`,
        'Use the chip that the table was made for.',
        { source: path },
      );
    }
  }
  const { settings, outOfRange } = limitSettings(
    chip,
    named(path, () => settingsFromRows(chip, table.rows)),
  );
  const achieved = simulate(chip, settings);
  const merit = target && figuresOfMerit(target.matrix, achieved, freePorts(chip));
  const hash = contentHash(JSON.stringify(table.rows.map(({ shifter, phaseRad }) => [shifter, phaseRad])));
  return { path, rows: table.rows, settings, outOfRange, readChip, target, achieved, merit, hash };
}

/**
 * Options that say how a target is to be read mean nothing for the one in a table, which has been read
 * already.
 */
function refuseTargetOptions({
  target,
  transpose,
  conjugate,
  ports,
  nearest,
  unitaryWithin,
}: TableOptions): void {
  if (target !== undefined) return;
  const given = Object.entries({
    transpose,
    conjugate,
    ports,
    nearest,
    'unitary-within': unitaryWithin,
  }).find(([, value]) => value !== undefined);
  if (given === undefined) return;
  throw new InputError(
    'usage/target',
    `--${given[0]} says how a target is read, and the table has its own already`,
    'Name a target with --target, or leave the option out.',
  );
}

async function originBeside(path: string): Promise<ReturnType<typeof readPhaseTable>['origin']> {
  const beside = nameBeside(path);
  if (beside === path || !existsSync(beside)) return null;
  const bytes = await readInputFile(beside);
  try {
    return named(beside, () => readPhaseTable(bytes)).origin;
  } catch (error) {
    // Some other JSON file happens to have the name.
    if (error instanceof InputError && error.code === 'table/format') return null;
    throw error;
  }
}

/** The JSON that belongs to a CSV: of the same name, in the same folder. */
function nameBeside(path: string): string {
  return path.replace(/\.[^./\\]+$/, '.json');
}

function chipUnknown(path: string): InputError {
  return new InputError(
    'table/chip',
    `there is no ${basename(nameBeside(path))} beside this table, so its chip is not known`,
    'Name the chip file with --chip, or say --layout and --target for an ideal chip.',
    { source: path },
  );
}
