import type { Command } from 'commander';
import { Option } from 'commander';
import { ratiosOfCell } from '../chip/cellSplitters.js';
import { EXTERNAL_GUIDES, INTERNAL_ARMS, SPLITTER_COUNTS, SPLITTER_FORMS } from '../chip/Chip.js';
import type { Chip, ExternalGuide, InternalArm, SplitterForm } from '../chip/Chip.js';
import type { ChipFile } from '../chip/chipSchema.js';
import type { ReadChip } from '../chip/readChip.js';
import type { MissedStates } from '../chip/reach.js';
import { missedStates } from '../chip/reach.js';
import { shifterCount } from '../chip/shifters.js';
import { InputError } from '../errors/InputError.js';
import { printableText } from '../figure/printableText.js';
import { runIdentity } from '../files/contentHash.js';
import type { Layout, Mirror } from '../mesh/Mesh.js';
import { LAYOUTS, MIRRORS } from '../mesh/Mesh.js';
import { decibelFromPowerRatio } from '../units/decibel.js';
import type { OutputOptions } from './commandOptions.js';
import { addOutputOptions, numberFor, pathFor } from './commandOptions.js';
import { createConsole } from './console.js';
import { finish } from './finish.js';
import { chipHash, loadChipFile } from './loadChip.js';
import { counted, shortNumber } from './messages.js';
import { defaultFolder, slug } from './names.js';
import { chipBlock, reportHead } from './reportParts.js';

interface MakingOptions {
  readonly modes?: number;
  readonly layout?: Layout;
  readonly mirror?: Mirror;
  readonly internal?: InternalArm;
  readonly external?: ExternalGuide;
  readonly splitterForm?: SplitterForm;
  readonly splitters?: string;
  readonly portShifters: boolean;
  readonly couplingRatio?: number;
  readonly name?: string;
}

interface ChipCommandOptions extends OutputOptions, MakingOptions {
  readonly to?: string;
}

/** Adds the command `chip [FILE]`. */
export function addChipCommand(parent: Command): void {
  const command = parent
    .command('chip')
    .argument('[file]', 'chip file to check')
    .summary('make or check a chip file')
    .description(
      'Check a chip file and say what it describes, or make one with --modes and the options below.\n' +
        'A chip that is made is written as NAME.chip.json into the folder of the results, and to --to.',
    )
    .option('--modes <number>', 'make a chip with so many ports', numberFor('--modes'))
    .addOption(new Option('--layout <name>', 'layout of the mesh (default: rectangular)').choices(LAYOUTS))
    .addOption(new Option('--mirror <way>', 'how the mesh is mirrored (default: none)').choices(MIRRORS))
    .addOption(
      new Option('--internal <arm>', 'arm of the internal phase (default: upper)').choices(INTERNAL_ARMS),
    )
    .addOption(
      new Option('--external <guide>', 'guide of the external phase (default: upper-input)').choices(
        EXTERNAL_GUIDES,
      ),
    )
    .addOption(
      new Option('--splitter-form <form>', 'form of the splitters (default: symmetric)').choices(
        SPLITTER_FORMS,
      ),
    )
    .addOption(
      new Option('--splitters <number>', 'splitters of a cell (default: 2)').choices(
        SPLITTER_COUNTS.map(String),
      ),
    )
    .option('--no-port-shifters', 'the chip has no phase shifters at its ports')
    .option(
      '--coupling-ratio <ratio>',
      'nominal ratio of every splitter (default: 0.5)',
      numberFor('--coupling-ratio'),
    )
    .option('--name <name>', 'name of the chip')
    .option('--to <file>', 'write the chip file here too', pathFor('--to'));
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Examples:
  phasewright chip my.chip.json
  phasewright chip --modes 6 --layout triangular --external lower-output --name beacon --to beacon.chip.json`,
    )
    .action(async (path: string | undefined, options: ChipCommandOptions) => {
      await runChip(path, options);
    });
}

async function runChip(path: string | undefined, options: ChipCommandOptions): Promise<void> {
  const console = createConsole(options);
  refuseBoth(path, options);
  const made = path === undefined;
  const read = made ? await makeChip(options) : await loadChipFile(path);
  const { chip } = read;
  const files = new Map<string, string>();
  const text = `${JSON.stringify(read.file, null, 2)}\n`;
  if (made) files.set(`${slug(chip.name)}.chip.json`, text);
  const runId = runIdentity('chip', { chip: chipHash(read) }, { made });
  await finish(console, options, {
    folder: options.out ?? defaultFolder('chip', made ? { text: chip.name } : { path, text: path }),
    files,
    named: options.to === undefined ? undefined : { path: options.to, content: text },
    report: { ...reportHead('chip', runId), chip: { ...chipBlock(chip), ...fullChipBlock(chip) } },
    show: () => console.result(describeChip(chip)),
  });
}

function refuseBoth(path: string | undefined, options: ChipCommandOptions): void {
  if (path === undefined && options.modes === undefined) {
    throw new InputError(
      'usage/chip',
      'chip needs a file to check, or --modes to make one',
      'For example: phasewright chip --modes 8 --layout triangular',
    );
  }
  const { modes, layout, mirror, internal, external, splitterForm, splitters, couplingRatio, name } = options;
  const style = { internal, external, splitterForm, splitters };
  const making = { modes, layout, mirror, ...style, couplingRatio, name };
  const given = Object.values(making).some((value) => value !== undefined) || !options.portShifters;
  if (path !== undefined && given) {
    throw new InputError(
      'usage/chip',
      'a file to check and options to make a chip do not go together',
      'Leave out the file, or the options; to change a chip, edit its file.',
    );
  }
}

async function makeChip(options: MakingOptions): Promise<ReadChip> {
  const { modes, layout, mirror, internal, external, splitterForm, portShifters, couplingRatio, name } =
    options;
  const splitters = options.splitters === undefined ? undefined : Number(options.splitters);
  const style = { internal, external, splitterForm, splitters };
  const document = {
    format: 1,
    name: name ?? `${layout ?? 'rectangular'} ${modes}`,
    modes,
    layout: layout ?? 'rectangular',
    mirror,
    portShifters: portShifters ? undefined : false,
    cellStyle: Object.values(style).some((value) => value !== undefined) ? style : undefined,
    couplingRatio,
  };
  const { chipFromDocument } = await import('../chip/readChip.js');
  return chipFromDocument(withoutUndefined(document));
}

/** Through JSON: what is undefined is not there. */
function withoutUndefined(document: unknown): ChipFile {
  return JSON.parse(JSON.stringify(document)) as ChipFile;
}

function fullChipBlock(chip: Chip): Record<string, unknown> {
  const { mesh, style, couplingRatios, loss } = chip;
  const facet = (amplitudes: Float64Array): number[] => Array.from(amplitudes, lossDb);
  return {
    mirror: mesh.mirror,
    cellStyle: style,
    portShifters: chip.portShifters,
    shifters: shifterCount(chip),
    couplingRatio: couplingRatios.length === 0 ? null : range(couplingRatios),
    lossDb: {
      splitter: lossDb(loss.splitter),
      shifter: lossDb(loss.shifter),
      column: lossDb(loss.column),
      input: facet(loss.input),
      output: facet(loss.output),
    },
    cellsMissingCross: countMissing(chip, 'cross'),
    cellsMissingBar: countMissing(chip, 'bar'),
  };
}

/** Amplitude factor to loss in dB, without a minus before 0. */
function lossDb(amplitude: number): number {
  return amplitude === 1 ? 0 : -decibelFromPowerRatio(amplitude ** 2);
}

function range(values: Float64Array): { least: number; greatest: number } {
  return {
    least: values.reduce((a, b) => Math.min(a, b)),
    greatest: values.reduce((a, b) => Math.max(a, b)),
  };
}

function countMissing({ mesh, style, couplingRatios }: Chip, state: keyof MissedStates): number {
  let count = 0;
  for (let cell = 0; cell < mesh.cells; cell++) {
    if (missedStates(ratiosOfCell(style, couplingRatios, cell))[state]) count++;
  }
  return count;
}

function describeChip(chip: Chip): string {
  const { mesh, style, couplingRatios, loss } = chip;
  const lines = [
    `${printableText(chip.name)}: ${mesh.layout} mesh${mesh.mirror === 'none' ? '' : ` (mirror ${mesh.mirror})`}, ${counted(mesh.modes, 'port')}, ` +
      `${counted(mesh.cells, 'cell')} in ${counted(mesh.columns, 'column')}, ${counted(shifterCount(chip), 'shifter')}`,
    `cells: internal phase ${style.internal}, external phase ${style.external}, ${style.splitters} ${style.splitterForm} splitters`,
    `port shifters: ${chip.portShifters ? 'yes' : 'no'}`,
  ];
  if (mesh.cells > 0) {
    const { least, greatest } = range(couplingRatios);
    lines.push(
      `coupling ratios ${least === greatest ? String(least) : `${shortNumber(least)} to ${shortNumber(greatest)}`}; ` +
        `${countMissing(chip, 'cross')} cells cannot reach the full cross state, ` +
        `${countMissing(chip, 'bar')} not the full bar state`,
    );
  }
  const facets = [loss.input, loss.output].map((amplitudes) => {
    const { least, greatest } = range(amplitudes);
    const [low, high] = [lossDb(greatest), lossDb(least)];
    return shortNumber(low) === shortNumber(high)
      ? shortNumber(low)
      : `${shortNumber(low)} to ${shortNumber(high)}`;
  });
  lines.push(
    `losses in dB: splitter ${shortNumber(lossDb(loss.splitter))}, shifter ${shortNumber(lossDb(loss.shifter))}, ` +
      `column ${shortNumber(lossDb(loss.column))}, input ${facets[0]}, output ${facets[1]}`,
  );
  if (chip.shifterRange) lines.push(`shifters reach ${chip.shifterRange[0]} to ${chip.shifterRange[1]} rad`);
  return lines.join('\n');
}
