import type { Command } from 'commander';
import { externalAtOutput } from '../chip/Chip.js';
import type { ReadChip } from '../chip/readChip.js';
import { printableText } from '../figure/printableText.js';
import { contentHash, matrixHash, runIdentity } from '../files/contentHash.js';
import { packageVersion } from '../files/version.js';
import { INTERRUPTED, withInterrupt } from '../files/withInterrupt.js';
import { MERIT_KEYS } from '../merit/merit.js';
import { freePorts, missingPortPhases } from '../merit/portPhaseFree.js';
import { formatPhaseJson } from '../program/formatPhaseJson.js';
import type { PhaseRow } from '../program/PhaseTable.js';
import { formatPhaseCsv, phaseRows } from '../program/PhaseTable.js';
import type { Retuning } from '../program/retunings.js';
import type { AngleUnit } from '../units/angle.js';
import type {
  ChipOptions,
  OutputOptions,
  RequireOption,
  TargetOptions,
  UnitOption,
} from './commandOptions.js';
import {
  addChipOptions,
  addOutputOptions,
  addRequireOption,
  addTargetOptions,
  addUnitOption,
  settledTargetOptions,
} from './commandOptions.js';
import type { Console } from './console.js';
import { createConsole } from './console.js';
import { captionLines } from './figureText.js';
import { finish } from './finish.js';
import { chipHash, idealChipFor, loadNamedChip, withoutSchema } from './loadChip.js';
import type { LoadedTarget, RawTarget } from './loadTarget.js';
import { prepareLoaded, rawTargetHash, readTarget } from './loadTarget.js';
import {
  cautions,
  counted,
  shortNumber,
  shownAngleNumber,
  tellOutOfRange,
  tellOutOfReach,
  tellRequirements,
} from './messages.js';
import { defaultFolder } from './names.js';
import { createSearchProgress } from './progress.js';
import {
  chipBlock,
  judge,
  meritLines,
  missingPortPhasesBlock,
  outOfRangeBlock,
  outOfReachBlock,
  reportHead,
  shownMerit,
} from './reportParts.js';
import type { RetuneOptions } from './retuneOptions.js';
import {
  addRetuneOptions,
  onChipPorts,
  requireSensibleRetuning,
  settledRetuneOptions,
} from './retuneOptions.js';
import {
  assignmentText,
  reassignmentBlock,
  refinementCaption,
  retuningBlocks,
  retuningText,
} from './retuneReport.js';
import type { ReassignedTarget, RetunedTarget, SearchControl } from './retuneTarget.js';
import { reassignTarget, retuneTarget } from './retuneTarget.js';
import type { MeshShade } from './shadeOption.js';
import { addShadeOption, marginsForShade } from './shadeOption.js';
import { textTable } from './textTable.js';

interface PhasesOptions
  extends OutputOptions, ChipOptions, TargetOptions, UnitOption, RequireOption, RetuneOptions {
  readonly shade: MeshShade;
}

/** Larger meshes are not drawn: a figure of them would be a grey field of several megabytes. */
const LARGEST_FIGURE = 64;
/** Longer tables are not printed; they are in the file. */
const LONGEST_TABLE = 160;

/** Adds the command `phases TARGET`. */
export function addPhasesCommand(parent: Command, setExitCode: (code: number) => void): void {
  const command = parent
    .command('phases')
    .argument('<target>', 'matrix file, formula such as dft(4), or - for standard input')
    .summary('find the phase of every shifter for a target')
    .description(
      'Find the phase of every shifter for a target on a chip, check what the chip then does, and draw it.\n' +
        'Writes phases.csv, phases.json, mesh.svg (up to 64 ports) and report.json. A .npy of shape (K, N, N) is a batch:\n' +
        'K numbered tables and merit.csv.',
    );
  addChipOptions(command);
  addTargetOptions(command);
  addRetuneOptions(command);
  addShadeOption(command);
  addRequireOption(command);
  addUnitOption(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Examples:
  phasewright phases "dft(4)"                                  an ideal rectangular mesh
  phasewright phases target.npy --chip my.chip.json            your own chip
  phasewright phases target.npy --chip my.chip.json --require fidelity=0.99 --json
  phasewright phases target.npy --chip my.chip.json --retune refine
  phasewright phases target.npy --chip my.chip.json --retune refine --inputs 1,3 --outputs 2-5
  phasewright phases "splitter(0.3)" --ports 3-4 --chip my.chip.json
  python3 make_target.py | phasewright phases - --layout triangular`,
    )
    .action(async (argument: string, options: PhasesOptions) => {
      setExitCode(await runPhases(argument, options));
    });
}

/** A target programmed on a chip, and how well the chip does it. */
interface Programmed extends RetunedTarget {
  /** The target as the chip's ports see it. */
  readonly target: LoadedTarget;
  readonly reassigned: ReassignedTarget;
  readonly rows: PhaseRow[];
  readonly missing: Float64Array | null;
}

async function runPhases(argument: string, options: PhasesOptions): Promise<number> {
  const console = createConsole(options);
  const [raw, namedChip] = await Promise.all([readTarget(argument), loadNamedChip(options)]);
  const readChip = namedChip ?? (await idealChipFor(raw.matrices[0]!.rows, options));
  const { modes } = readChip.chip.mesh;
  requireSensibleRetuning(options, modes);
  const inputs = { target: rawTargetHash(raw), chip: chipHash(readChip) };
  const settled = { ...settledTargetOptions(options), ...settledRetuneOptions(options) };
  const runId = runIdentity('phases', inputs, {
    ...settled,
    ...(options.shade === 'phase' ? {} : { shade: options.shade }),
  });
  const folder = options.out ?? defaultFolder('phases', { ...raw, text: raw.source });
  const targets = raw.matrices.map((matrix, k) =>
    prepareLoaded(raw, matrix, options, namedChip ? modes : undefined, k),
  );
  const progress = createSearchProgress(console);
  const { value, interrupted } = await withInterrupt(async (signal) => {
    const each: Programmed[] = [];
    for (const target of targets) {
      each.push(
        await programOne(readChip, target, options, { signal, onProgress: (at) => progress.show(at) }),
      );
    }
    return each;
  });
  progress.end();
  // Interrupted, what is left is programmed without a search: nothing is lost.
  const run: Run = { console, options, readChip, raw, each: value!, runId, folder, settled };
  const code = await (raw.batch ? reportBatch(run) : reportOne(run));
  if (!interrupted) return code;
  console.warning('interrupted: these are the best phases so far');
  return INTERRUPTED;
}

interface Run {
  readonly console: Console;
  readonly options: PhasesOptions;
  readonly readChip: ReadChip;
  readonly raw: RawTarget;
  readonly each: readonly Programmed[];
  readonly runId: string;
  readonly folder: string;
  /** The options that change the phases. */
  readonly settled: Readonly<Record<string, unknown>>;
}

async function programOne(
  { chip }: ReadChip,
  target: LoadedTarget,
  asked: PhasesOptions,
  control: SearchControl,
): Promise<Programmed> {
  const options = onChipPorts(asked);
  const reassigned = reassignTarget(chip, target.matrix, options, control.signal);
  const { matrix, assignment } = reassigned;
  const found = await retuneTarget(chip, matrix, assignment, options, control);
  return {
    ...found,
    target: { ...target, matrix, source: `${target.source}${assignmentText(assignment)}` },
    reassigned,
    rows: phaseRows(chip, found.settings),
    missing: chip.portShifters ? null : missingPortPhases(matrix, found.achieved, freePorts(chip)),
  };
}

async function reportOne(run: Run): Promise<number> {
  const { console, options, readChip, runId, folder } = run;
  const one = run.each[0]!;
  const { chip } = readChip;
  const { target, settings, merit } = one;
  const files = new Map<string, string>(tableFiles(run, one, ''));
  if (chip.mesh.modes <= LARGEST_FIGURE) {
    const { drawMeshFigure } = await import('../figure/drawMeshFigure.js');
    const caption = refinementCaption(one, captionLines(chip, target.source, merit));
    files.set(
      'mesh.svg',
      drawMeshFigure(chip, settings, {
        title: chip.name,
        captionLines: caption,
        ...marginsForShade(options.shade, one.margins),
      }),
    );
  }
  const requirements = judge(options.require ?? [], merit);
  await finish(console, options, {
    folder,
    files,
    report: {
      ...reportHead('phases', runId),
      target: {
        source: target.source,
        modes: target.matrix.rows,
        unitarityDefect: target.unitarityDefect,
        nearestDistance: target.nearestDistance,
      },
      chip: chipBlock(chip),
      ...programmedBlocks(run, one),
      requirements,
      cautions: cautions(chip, isBeyondPi(one)),
    },
    show: () => showOne(run, one),
  });
  tellOutOfReach(console, chip, one.outOfReach, MEANING_OUT_OF_REACH[options.retune]);
  tellOutOfRange(console, one.outOfRange, options.unit);
  for (const caution of cautions(chip, isBeyondPi(one))) console.message(`caution: ${caution}`);
  return tellRequirements(console, requirements);
}

function isBeyondPi({ settings }: Programmed): boolean {
  return settings.internal.some((theta) => theta > Math.PI);
}

/** What becomes of cells that are out of reach. */
const MEANING_OUT_OF_REACH: Readonly<Record<Retuning, string>> = {
  none: 'no phases do the target exactly',
  cell: 'the nearest in reach is set',
  mesh: 'later cells make good what they can',
  refine: 'all phases together make good what they can',
};

function showOne({ console, options, readChip }: Run, one: Programmed): void {
  const { target, rows, merit, retunings } = one;
  const { chip } = readChip;
  const meritUncorrected =
    retunings[0]!.retune === 'none' && retunings.length > 1 ? retunings[0]!.merit : null;
  console.result(
    `${printableText(chip.name)}: ${printableText(target.source)} on ${counted(chip.mesh.cells, 'cell')} in ${counted(chip.mesh.columns, 'column')}\n`,
  );
  console.result(meritLines(merit, meritUncorrected));
  if (target.nearestDistance !== null) {
    console.result(`\nnearest unitary taken, at distance ${shortNumber(target.nearestDistance)} (Frobenius)`);
  }
  if (!chip.portShifters) {
    console.result(
      externalAtOutput(chip.style)
        ? '\nno port shifters: the port-phase-free fidelity is blind to the phases of the inputs, as light in one input is'
        : '\nno port shifters: the port-phase-free fidelity is what detectors of power see',
    );
  }
  for (const paragraph of retuningText(chip, one, one.reassigned, options.unit))
    console.result(`\n${paragraph}`);
  console.result(`\n${shownRows(readChip, rows, options.unit)}`);
}

/** The blocks of a report that belong to one programmed target. */
function programmedBlocks({ readChip: { chip } }: Run, one: Programmed): Record<string, unknown> {
  const { merit, retunings, outOfReach, outOfRange, missing } = one;
  const isIdeal = chip.couplingRatios.every((ratio) => ratio === 0.5);
  return {
    merit,
    ...(isIdeal ? {} : { meritUncorrected: retunings[0]!.merit }),
    outOfReach: outOfReachBlock(chip, outOfReach),
    outOfRange: outOfRangeBlock(outOfRange),
    missingPortPhases: missingPortPhasesBlock(missing),
    ...retuningBlocks(chip, one),
    ...reassignmentBlock(one.reassigned),
  };
}

/** phases.csv and phases.json of one target, their names ending in `suffix`. */
function tableFiles(
  run: Run,
  { target, rows }: Programmed,
  suffix: string,
): [name: string, content: string][] {
  const csv = formatPhaseCsv(rows);
  const json = formatPhaseJson(rows, {
    version: packageVersion(),
    target,
    chip: withoutSchema(run.readChip.file),
    options: run.settled,
    hashes: { target: matrixHash(target.matrix), chip: chipHash(run.readChip), phases: contentHash(csv) },
  });
  return [
    [`phases${suffix}.csv`, csv],
    [`phases${suffix}.json`, json],
  ];
}

async function reportBatch(run: Run): Promise<number> {
  const { console, options, readChip, raw, each, runId, folder } = run;
  const digits = Math.max(3, String(each.length).length);
  const files = new Map<string, string>();
  const judged = each.map(({ merit }) => judge(options.require ?? [], merit));
  let worst = 0;
  const tables = each.map((one, k) => {
    const [csv, json] = tableFiles(run, one, `-${String(k + 1).padStart(digits, '0')}`);
    for (const [name, content] of [csv!, json!]) files.set(name, content);
    if (!(one.merit.fidelity >= each[worst]!.merit.fidelity)) worst = k;
    return { matrix: k + 1, table: csv![0], ...programmedBlocks(run, one), requirements: judged[k] };
  });
  const meritRows = each.map(({ merit }, k) =>
    [k + 1, tables[k]!.table, ...MERIT_KEYS.map((key) => merit[key])].join(','),
  );
  files.set('merit.csv', `${['matrix', 'table', ...MERIT_KEYS].join(',')}\n${meritRows.join('\n')}\n`);
  await finish(console, options, {
    folder,
    files,
    report: {
      ...reportHead('phases', runId),
      target: {
        source: raw.source,
        modes: each[0]!.target.matrix.rows,
        matrices: each.length,
        unitarityDefect: Math.max(...each.map(({ target }) => target.unitarityDefect)),
        nearestDistance:
          options.nearest === true
            ? Math.max(...each.map(({ target }) => target.nearestDistance ?? 0))
            : null,
      },
      chip: chipBlock(readChip.chip),
      worst: worst + 1,
      ...programmedBlocks(run, each[worst]!),
      requirements: judged[worst],
      tables,
      cautions: cautions(readChip.chip, each.some(isBeyondPi)),
    },
    show: () =>
      console.result(
        `${printableText(readChip.chip.name)}: ${each.length} targets from ${printableText(raw.source)}; the least faithful is number ` +
          `${worst + 1}, with fidelity ${shownMerit(each[worst]!.merit.fidelity)}`,
      ),
  });
  const short = each.filter(({ outOfReach, outOfRange }) => outOfReach.length + outOfRange.length > 0).length;
  if (short > 0)
    console.warning(`${short} of them ask for more than cells or shifters can do (see the report)`);
  for (const caution of cautions(readChip.chip, each.some(isBeyondPi)))
    console.message(`caution: ${caution}`);
  const codes = judged.map((one, k) => tellRequirements(console, one, ` by matrix ${k + 1}`));
  return Math.max(...codes);
}

function shownRows({ chip }: ReadChip, rows: readonly PhaseRow[], unit: AngleUnit): string {
  if (rows.length > LONGEST_TABLE) return `${rows.length} phases: see phases.csv`;
  const named = rows.some(({ name }) => name !== '');
  const header = ['shifter', 'cell', 'role', 'column', 'port', `phase (${unit})`, ...(named ? ['name'] : [])];
  const cells = rows.map((row) => [
    String(row.shifter),
    String(row.cell ?? ''),
    row.role,
    String(row.column ?? ''),
    chip.portNames ? `${row.port} ${printableText(chip.portNames[row.port - 1]!)}` : String(row.port),
    shownAngleNumber(row.phaseRad, unit),
    ...(named ? [printableText(row.name)] : []),
  ]);
  return textTable(header, cells);
}
