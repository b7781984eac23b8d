import type { Command } from 'commander';
import { InputError } from '../errors/InputError.js';
import { printableText } from '../figure/printableText.js';
import { matrixHash, runIdentity } from '../files/contentHash.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { figuresOfMerit } from '../merit/merit.js';
import { MATRIX_FILE_KINDS, matrixFileKind } from '../target/MatrixFileKind.js';
import { writeMatrix } from '../target/writeMatrix.js';
import type { OutputOptions, RequireOption, TargetOptions } from './commandOptions.js';
import {
  addOutputOptions,
  addRequireOption,
  addTargetOptions,
  pathFor,
  settledTargetOptions,
} from './commandOptions.js';
import type { Console } from './console.js';
import { createConsole } from './console.js';
import { finish } from './finish.js';
import { loadChipFile } from './loadChip.js';
import { prepareLoaded, readTarget, theOnlyMatrix } from './loadTarget.js';
import { shortNumber, tellRequirements } from './messages.js';
import { defaultFolder } from './names.js';
import { judge, meritLines, reportHead } from './reportParts.js';

interface TargetCommandOptions extends OutputOptions, TargetOptions, RequireOption {
  readonly against?: string;
  readonly to?: string;
  readonly chip?: string;
}

/** Larger matrices are not printed. */
const LARGEST_SHOWN = 8;

/** Adds the command `target TARGET`. */
export function addTargetCommand(parent: Command, setExitCode: (code: number) => void): void {
  const command = parent
    .command('target')
    .argument('<target>', 'matrix file, formula such as dft(4), or - for standard input')
    .summary('inspect, convert or compare a target')
    .description(
      'Inspect a target: size, unitarity, entries. Convert it to another file kind (--to), or compare a measured\n' +
        'matrix with it (--against): every figure of merit of that matrix as what a chip does.',
    )
    .option('--against <matrix>', 'judge this matrix, unitary or not, against the target')
    .option(
      '--to <file>',
      `write the target to this file (${MATRIX_FILE_KINDS.map((kind) => `.${kind}`).join(', ')})`,
      pathFor('--to'),
    )
    .option('--chip <file>', 'the chip whose ports --ports counts', pathFor('--chip'));
  addTargetOptions(command);
  addRequireOption(command);
  addOutputOptions(command)
    .addHelpText(
      'after',
      `
Examples:
  phasewright target "hadamard(4)"
  phasewright target raw.csv --nearest --to target.npy
  phasewright target target.npy --against measured.npy --require fidelity=0.98`,
    )
    .action(async (argument: string, options: TargetCommandOptions) => {
      setExitCode(await runTarget(argument, options));
    });
}

async function runTarget(argument: string, options: TargetCommandOptions): Promise<number> {
  const console = createConsole(options);
  const kind = options.to === undefined ? undefined : matrixFileKind(options.to);
  if (options.to !== undefined && kind === undefined) {
    throw new InputError(
      'target/unknown-ending',
      'no matrix is written to a file with this ending',
      `Known endings are ${MATRIX_FILE_KINDS.map((known) => `.${known}`).join(', ')}.`,
      { source: options.to },
    );
  }
  const raw = await readTarget(argument);
  const chip = options.chip === undefined ? undefined : (await loadChipFile(options.chip)).chip;
  const { matrix, ...loaded } = prepareLoaded(raw, theOnlyMatrix(raw), options, chip?.mesh.modes);
  const against = options.against === undefined ? undefined : await readAgainst(options.against, matrix);
  const merit = against ? figuresOfMerit(matrix, against.matrix) : null;
  const requirements = judgeOrRefuse(options, merit);
  const runId = runIdentity(
    'target',
    { target: matrixHash(matrix), against: against ? matrixHash(against.matrix) : '' },
    settledTargetOptions(options),
  );
  await finish(console, options, {
    folder: options.out ?? defaultFolder('target', { ...raw, text: raw.source }),
    files: new Map(),
    named: options.to === undefined ? undefined : { path: options.to, content: writeMatrix(matrix, kind!) },
    report: {
      ...reportHead('target', runId),
      target: { ...loaded, modes: matrix.rows },
      ...(against && merit ? { against: { source: against.source }, merit, requirements } : {}),
    },
    show: () => {
      console.result(`${printableText(loaded.source)}: ${matrix.rows} x ${matrix.rows}, ${describe(matrix)}`);
      console.result(`unitarity defect ${shortNumber(loaded.unitarityDefect)} (max |U^dagger U - I|)`);
      if (loaded.nearestDistance !== null) {
        console.result(
          `nearest unitary taken, at distance ${shortNumber(loaded.nearestDistance)} (Frobenius)`,
        );
      }
      showMatrix(console, matrix);
      if (against && merit)
        console.result(`\n${printableText(against.source)} against it:\n${meritLines(merit)}`);
    },
  });
  return tellRequirements(console, requirements);
}

async function readAgainst(
  argument: string,
  target: ComplexMatrix,
): Promise<{ readonly source: string; readonly matrix: ComplexMatrix }> {
  const raw = await readTarget(argument);
  const matrix = theOnlyMatrix(raw);
  if (matrix.rows !== target.rows) {
    throw new InputError(
      'target/size',
      `this matrix has ${matrix.rows} ports, the target ${target.rows}`,
      'Compare matrices of one size.',
      { source: raw.source },
    );
  }
  return { source: raw.source, matrix };
}

function judgeOrRefuse(
  { require = [] }: RequireOption,
  merit: ReturnType<typeof figuresOfMerit> | null,
): ReturnType<typeof judge> {
  if (merit) return judge(require, merit);
  if (require.length === 0) return [];
  throw new InputError(
    'usage/require',
    '--require judges a matrix, and there is none to judge',
    'Name the measured matrix with --against.',
  );
}

/** What kind of matrix it is, to the precision with which entries are written. */
function describe({ rows: modes, re, im }: ComplexMatrix): string {
  const near = (x: number, y: number): boolean => Math.abs(x - y) <= 1e-12;
  const kinds: string[] = [];
  const zeros = re.filter((value, k) => near(value, 0) && near(im[k]!, 0)).length;
  const isIdentity =
    re.every((value, k) => near(value, k % (modes + 1) === 0 ? 1 : 0)) && im.every((y) => near(y, 0));
  const isPermutation =
    re.every((value) => near(value, 0) || near(value, 1)) &&
    im.every((y) => near(y, 0)) &&
    zeros === modes * (modes - 1);
  if (isIdentity) kinds.push('the identity');
  else if (isPermutation) kinds.push('a permutation');
  else kinds.push(im.every((y) => near(y, 0)) ? 'real' : 'complex');
  if (zeros > 0 && !isPermutation) kinds.push(`${zeros} of ${modes * modes} entries 0`);
  return kinds.join(', ');
}

function showMatrix(console: Console, { rows: modes, re, im }: ComplexMatrix): void {
  if (modes > LARGEST_SHOWN) return;
  const number = (value: number): string => (Math.abs(value) < 5e-6 ? 0 : value).toFixed(5);
  for (let i = 0; i < modes; i++) {
    const entries = Array.from({ length: modes }, (_, j) => {
      const y = im[i * modes + j]!;
      return `${number(re[i * modes + j]!).padStart(8)}${y < -5e-6 ? '-' : '+'}${number(Math.abs(y))}i`;
    });
    console.result(entries.join('  '));
  }
}
