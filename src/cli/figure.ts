import type { Command } from 'commander';
import { InputError } from '../errors/InputError.js';
import { matrixHash, runIdentity } from '../files/contentHash.js';
import type { OutputOptions } from './commandOptions.js';
import { addChipOptions, addOutputOptions, addTargetOptions, pathFor } from './commandOptions.js';
import { createConsole } from './console.js';
import { captionLines } from './figureText.js';
import { finish } from './finish.js';
import { chipHash } from './loadChip.js';
import type { TableOptions } from './loadTable.js';
import { loadTable } from './loadTable.js';
import { tellOutOfRange } from './messages.js';
import { defaultTableFolder } from './names.js';
import { cellMargins } from '../program/cellMargins.js';
import { programChip } from '../program/programChip.js';
import { chipBlock, outOfRangeBlock, reportHead } from './reportParts.js';
import type { MeshShade } from './shadeOption.js';
import { addShadeOption, marginsForShade } from './shadeOption.js';

interface FigureOptions extends OutputOptions, TableOptions {
  readonly to?: string;
  readonly width?: 'one-column' | 'two-column' | number;
  readonly numbers?: boolean;
  readonly cellNumbers?: boolean;
  readonly title?: string;
  readonly shade: MeshShade;
}

/** Adds the command `figure TABLE`. */
export function addFigureCommand(parent: Command): void {
  const command = parent
    .command('figure')
    .argument('<table>', 'phases.csv or phases.json')
    .summary('draw the mesh with its phases as SVG')
    .description('Draw the mesh of a phase table as SVG: mesh.svg in the folder of the results, and --to.')
    .option('--target <target>', 'the target named in the caption instead of the one in the table')
    .option('--width <width>', 'one-column (85 mm), two-column (178 mm) or millimetres', parseWidth)
    .option('--numbers', 'write the phases beside the shifters, also on larger meshes')
    .option('--no-numbers', 'show the phases by colour only')
    .option('--cell-numbers', 'number the cells')
    .option('--title <text>', 'title instead of the name of the chip')
    .option('--to <file>', 'write the figure here too (.svg)', pathFor('--to'));
  addShadeOption(command);
  addChipOptions(command);
  addTargetOptions(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Examples:
  phasewright figure out/phases-dft-4/phases.csv --width one-column --to mesh.svg
  phasewright figure phases.csv --chip my.chip.json --no-numbers --title "Chip 7, as programmed"
  phasewright figure phases.json --shade reach`,
    )
    .action(async (argument: string, options: FigureOptions) => {
      await runFigure(argument, options);
    });
}

async function runFigure(path: string, options: FigureOptions): Promise<void> {
  const console = createConsole(options);
  if (options.to !== undefined && !options.to.toLowerCase().endsWith('.svg')) {
    throw new InputError(
      'figure/ending',
      'figures are written as .svg',
      'Write an .svg and convert it, for example with rsvg-convert.',
      { source: options.to },
    );
  }
  const table = await loadTable(path, options);
  const { chip } = table.readChip;
  const { drawMeshFigure } = await import('../figure/drawMeshFigure.js');
  const { width, numbers, cellNumbers, title, shade } = options;
  if (shade === 'reach' && table.target === null) {
    throw new InputError(
      'table/target',
      'what is wanted of the cells is not known without the target of this table',
      'Name it with --target.',
      { source: path },
    );
  }
  const svg = drawMeshFigure(chip, table.settings, {
    title: title ?? chip.name,
    captionLines: captionLines(chip, table.target?.source ?? null, table.merit),
    ...(shade === 'reach'
      ? marginsForShade(shade, cellMargins(chip, programChip(chip, table.target!.matrix).program))
      : {}),
    ...(width === undefined ? {} : { width }),
    ...(numbers === undefined ? {} : { numbers }),
    ...(cellNumbers === undefined ? {} : { cellNumbers }),
  });
  const runId = runIdentity(
    'figure',
    {
      table: table.hash,
      chip: chipHash(table.readChip),
      target: table.target ? matrixHash(table.target.matrix) : '',
    },
    { width, numbers, cellNumbers, title, ...(shade === 'phase' ? {} : { shade }) },
  );
  await finish(console, options, {
    folder: options.out ?? defaultTableFolder('figure', path),
    files: new Map([['mesh.svg', svg]]),
    named: options.to === undefined ? undefined : { path: options.to, content: svg },
    report: {
      ...reportHead('figure', runId),
      table: { source: path },
      ...(table.target ? { target: { source: table.target.source, modes: chip.mesh.modes } } : {}),
      chip: chipBlock(chip),
      outOfRange: outOfRangeBlock(table.outOfRange),
    },
    show: () => undefined,
  });
  tellOutOfRange(console, table.outOfRange, 'rad');
}

function parseWidth(text: string): 'one-column' | 'two-column' | number {
  if (text === 'one-column' || text === 'two-column') return text;
  const width = Number(text);
  if (text.trim() !== '' && width > 0 && width < Infinity) return width;
  throw new InputError(
    'usage/width',
    `--width ${text}: this is no width`,
    'Write one-column, two-column or a number of millimetres.',
  );
}
