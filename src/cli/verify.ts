import type { Command } from 'commander';
import { InputError } from '../errors/InputError.js';
import { printableText } from '../figure/printableText.js';
import { matrixHash, runIdentity } from '../files/contentHash.js';
import { unitarityDefect } from '../matrix/norms.js';
import { figuresOfMerit } from '../merit/merit.js';
import { freePorts, missingPortPhases } from '../merit/portPhaseFree.js';
import { programChip } from '../program/programChip.js';
import { simulate } from '../simulate/simulate.js';
import type { OutputOptions, RequireOption, UnitOption } from './commandOptions.js';
import {
  addChipOptions,
  addOutputOptions,
  addRequireOption,
  addTargetOptions,
  addUnitOption,
  settledTargetOptions,
} from './commandOptions.js';
import { createConsole } from './console.js';
import { finish } from './finish.js';
import { chipHash } from './loadChip.js';
import type { TableOptions } from './loadTable.js';
import { loadTable } from './loadTable.js';
import { tellOutOfRange, tellOutOfReach, tellRequirements } from './messages.js';
import { defaultTableFolder } from './names.js';
import {
  chipBlock,
  judge,
  meritLines,
  missingPortPhasesBlock,
  outOfRangeBlock,
  outOfReachBlock,
  reportHead,
} from './reportParts.js';

interface VerifyOptions extends OutputOptions, TableOptions, UnitOption, RequireOption {}

/** Adds the command `verify TABLE`. */
export function addVerifyCommand(parent: Command, setExitCode: (code: number) => void): void {
  const command = parent
    .command('verify')
    .argument('<table>', 'phases.csv or phases.json')
    .summary('find what a phase table does on a chip')
    .description(
      'Find what a phase table does on a chip: simulate it and compare it with its target.\n' +
        'A CSV uses the JSON of the same name beside it for chip and target; its own phases win.',
    )
    .option('--target <target>', 'compare with this target instead of the one in the table');
  addChipOptions(command);
  addTargetOptions(command);
  addRequireOption(command);
  addUnitOption(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Examples:
  phasewright verify out/phases-dft-4/phases.csv
  phasewright verify edited.csv --chip my.chip.json --target target.npy --require fidelity=0.99
  phasewright verify out/phases-dft-4/phases.json --chip as-measured.chip.json`,
    )
    .action(async (argument: string, options: VerifyOptions) => {
      setExitCode(await runVerify(argument, options));
    });
}

async function runVerify(path: string, options: VerifyOptions): Promise<number> {
  const console = createConsole(options);
  const table = await loadTable(path, options);
  const { chip } = table.readChip;
  const { target } = table;
  if (target === null) {
    throw new InputError('table/target', 'the target of this table is not known', 'Name it with --target.', {
      source: path,
    });
  }
  const { outOfRange, achieved } = table;
  const merit = table.merit!;
  const { program, uncorrected } = programChip(chip, target.matrix);
  const free = freePorts(chip);
  const meritUncorrected = uncorrected
    ? figuresOfMerit(target.matrix, simulate(chip, uncorrected.settings), free)
    : null;
  const requirements = judge(options.require ?? [], merit);
  const runId = runIdentity(
    'verify',
    { table: table.hash, chip: chipHash(table.readChip), target: matrixHash(target.matrix) },
    settledTargetOptions(options),
  );
  await finish(console, options, {
    folder: options.out ?? defaultTableFolder('verify', path),
    files: new Map(),
    report: {
      ...reportHead('verify', runId),
      table: { source: path },
      target: {
        source: target.source,
        modes: target.matrix.rows,
        unitarityDefect: target.unitarityDefect ?? unitarityDefect(target.matrix),
        nearestDistance: target.nearestDistance,
      },
      chip: chipBlock(chip),
      merit,
      ...(meritUncorrected ? { meritUncorrected } : {}),
      outOfReach: outOfReachBlock(chip, program.outOfReach),
      outOfRange: outOfRangeBlock(outOfRange),
      missingPortPhases: missingPortPhasesBlock(
        chip.portShifters ? null : missingPortPhases(target.matrix, achieved, free),
      ),
      requirements,
    },
    show: () => {
      console.result(
        `${printableText(path)} on ${printableText(chip.name)}, against ${printableText(target.source)}\n`,
      );
      console.result(meritLines(merit, meritUncorrected));
    },
  });
  tellOutOfReach(console, chip, program.outOfReach, 'no table does this target exactly on this chip');
  tellOutOfRange(console, outOfRange, options.unit);
  return tellRequirements(console, requirements);
}
