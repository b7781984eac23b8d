import { truncate } from 'node:fs/promises';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import type { CommandRun } from './runCommand.js';
import { freshFolder, npyBytes, npyFile, runCommand, runMany } from './runCommand.js';

/** A fault that a person hands in: what the first line must tell, and what the second. */
interface Fault {
  readonly name: string;
  readonly args: readonly string[];
  readonly files?: Readonly<Record<string, string | Uint8Array>>;
  readonly says: RegExp;
  readonly mends: RegExp;
}

/** A target in a file of this name and content. */
function target(
  file: string,
  content: string | Uint8Array,
  says: RegExp,
  mends: RegExp,
  ...options: string[]
): Fault {
  return {
    name: `${file} (${says.source})`,
    args: ['phases', file, ...options],
    files: { [file]: content },
    says,
    mends,
  };
}

/** A formula as the target. */
function formula(text: string, says: RegExp, mends: RegExp): Fault {
  return { name: `formula ${text.slice(0, 50)}`, args: ['phases', text], says, mends };
}

/** A chip file, for a target of three ports. */
function chip(document: unknown, says: RegExp, mends: RegExp): Fault {
  const content = typeof document === 'string' ? document : JSON.stringify(document);
  return {
    name: `chip ${content.slice(0, 60)}`,
    args: ['chip', 'c.chip.json'],
    files: { 'c.chip.json': content },
    says: new RegExp(`^error: c\\.chip\\.json(, |: ).*${says.source}`),
    mends,
  };
}

const HEADER = 'shifter,cell,role,column,port,phase_rad,name';
const ROWS = ['1,1,external,1,1,0,', '2,1,internal,1,1,0,', '3,,output,,1,0,', '4,,output,,2,0,'];

/** A phase table of a chip of two ports. */
function table(lines: readonly string[], says: RegExp, mends: RegExp): Fault {
  return {
    name: `table (${says.source})`,
    args: ['verify', 't.csv', '--target', 'identity(2)', '--layout', 'rectangular'],
    files: { 't.csv': `${lines.join('\n')}\n` },
    says,
    mends,
  };
}

const NESTED = `${'['.repeat(5000)}${']'.repeat(5000)}`;
const UNITY = '1,0\n0,1\n';
/** dft(2) with three digits. */
const THREE_DIGITS = '0.707,0.707\n0.707,-0.707\n';

const FILES: readonly Fault[] = [
  {
    name: 'missing',
    args: ['phases', 'nope.csv'],
    says: /^error: nope\.csv: there is no such file$/,
    mends: /Check the path/,
  },
  {
    name: 'missing, with a near name',
    args: ['phases', 'tagret.csv'],
    files: { 'target.csv': UNITY },
    says: /tagret\.csv: there is no such file/,
    mends: /^Did you mean target\.csv\?$/,
  },
  {
    name: 'folder',
    args: ['phases', 'm.csv'],
    files: { 'm.csv/x': '' },
    says: /m\.csv: this is a folder/,
    mends: /file in it/,
  },
  {
    name: 'folder without an ending',
    args: ['phases', 'm'],
    files: { 'm/x': '' },
    says: /m: this is a folder/,
    mends: /file in it/,
  },
  target('m.csv', '', /m\.csv: there is no matrix in it/, /square matrix/),
  target('m.json', '\n', /m\.json: .*(empty|no matrix)/, /./),
  target('m.npy', '', /m\.npy: there is no matrix/, /./),
  target('m.mtx', '', /m\.mtx: there is no matrix/, /./),
  target('m.npy', npyFile([2, 2], [[1, 0]]), /m\.npy: .*ends within/, /numpy\.save/),
  target('m.json', '{"matrix": [[1, 0], [0', /m\.json.*: this is not JSON/, /[Mm]end|Look/),
  target(
    'm.mtx',
    '%%MatrixMarket matrix array real general\n2 2\n1\n0\n',
    /m\.mtx: the file ends too early: entry \(1, 2\)/,
    /whole file/,
  ),
  target(
    'm.csv',
    Buffer.from([0x89, 0x50, 0x4e, 0x47, 0, 1, 2, 3]),
    /m\.csv: this is not a text file/,
    /\.npy/,
  ),
  target('m.csv', Buffer.from([0x31, 0x2c, 0xe4, 0xff]), /m\.csv: .*not UTF-8/, /UTF-8/),
  target('m.npy', '1,0\n0,1\n', /m\.npy: .*not those of a NumPy array/, /numpy\.save/),
  target(
    'm.xlsx',
    'PK',
    /m\.xlsx: no matrix is read from a file with this ending/,
    /\.csv, \.tsv, \.txt, \.json, \.npy, \.mtx/,
  ),
  { name: 'unknown ending, no file', args: ['phases', 'größe (2).mat'], says: /ending/, mends: /\.npy/ },
  target('m.csv', '1,0\n0,1,2\n', /m\.csv, row 2: 3 entries, but row 1 has 2/, /same number/),
  target('m.json', '[[1, 0], [1]]', /m\.json, row 2: 1 entry, but row 1 has 2/, /same number/),
  target('m.csv', '1,0,0\n0,1,0\n', /m\.csv: the matrix has 2 rows and 3 columns/, /square/),
  target('m.csv', '1,0\n0,nan\n', /m\.csv, row 2, column 2: the entry is nan/, /finite/),
  target('m.json', '[[1, 0], [0, NaN]]', /m\.json.*(NaN|not JSON)/, /./),
  target('m.csv', '1,0\n-Inf,1\n', /m\.csv, row 2, column 1: the entry is -Inf/, /finite/),
  target(
    'm.npy',
    npyFile([1, 1], [[Infinity, 0]]),
    /m\.npy, row 1, column 1: the entry is .*Infinity/,
    /finite/,
  ),
  target('m.csv', '1,zero\n0,1\n', /m\.csv, row 1, column 2: "zero" is not a number/, /number/),
  target('m.json', '[[1, {}], [0, 1]]', /m\.json, row 1, column 2: an object is not an entry/, /re/),
  target('m.csv', 'in1,in2\n1,0\n0,1\n', /m\.csv, row 1: the first row holds words/, /header/),
  target(
    'm.npy',
    npyBytes("{'descr': '|O', 'fortran_order': False, 'shape': (2, 2), }", new Uint8Array(32)),
    /m\.npy: .*pickled/,
    /astype\(complex\)/,
  ),
  target(
    'm.npy',
    npyFile(
      [2, 1, 2],
      [
        [1, 0],
        [0, 0],
        [0, 0],
        [1, 0],
      ],
    ),
    /m\.npy: the matrix has 1 row and 2 columns/,
    /square/,
  ),
  target('m.npy', npyFile([1, 1, 1, 1], [[1, 0]]), /m\.npy: .*(dimension|shape)/, /./),
  target('m.json', NESTED, /m\.json: the JSON is nested more than \d+ levels/, /./),
  target(
    'm.csv',
    THREE_DIGITS,
    /m\.csv: the target is not unitary: max \|U\^dagger U - I\| is 0\.0003/,
    /--nearest/,
  ),
  target(
    'm.csv',
    '1,1\n1,1\n',
    /m\.csv: .*smallest singular value is [\d.e-]+, its largest 2/,
    /independent/,
    '--nearest',
  ),
  target(
    'm.csv',
    UNITY,
    /m\.csv: the target has 2 ports, the chip 4/,
    /--ports 1-2/,
    '--chip',
    'four.chip.json',
  ),
  target(
    'm.csv',
    UNITY,
    /ports 4-5 do not lie on a chip of 4 ports/,
    /1-4/,
    '--chip',
    'four.chip.json',
    '--ports',
    '4-5',
  ),
  target('m.csv', `${HEADER}\n${ROWS.join('\n')}\n`, /m\.csv: this is a phase table/, /matrix/),
  target('m.json', '{"modes": 4}', /m\.json: this is a chip file/, /matrix/),
  {
    name: 'a batch where one is taken',
    args: ['target', 'm.npy'],
    files: {
      'm.npy': npyFile(
        [2, 1, 1],
        [
          [1, 0],
          [1, 0],
        ],
      ),
    },
    says: /m\.npy: the file holds 2 matrices/,
    mends: /phases/,
  },
];

const FORMULAS: readonly Fault[] = [
  formula('dft(3', /dft\(3: the formula cannot be read at character 6/, /Mend/),
  formula('dtf(3) * i', /the name "dtf" is unknown/, /^Did you mean dft\?$/),
  formula('import(1)', /"import" may not be used/, /Use numbers/),
  formula('constructor("return 1")()', /./, /Use numbers|Mend/),
  formula('__proto__', /"__proto__" is unknown/, /Use numbers/),
  formula('dft(2).constructor', /property/, /Use numbers/),
  formula('1:1e9', /a range/, /Use numbers/),
  formula('[1, 2, 3]', /gives a list, not a square matrix/, /\[1, 0; 0, 1\]/),
  formula('zeros(1e6, 1e6)', /1000000 x 1000000/, /smaller/),
  formula('haar(4)', /without a seed/, /haar\(4, 1\)/),
  formula('dft(2000)', /2000 x 2000, and at most 1024/, /smaller/),
  formula('splitter(1.5)', /1\.5 does not lie in \[0, 1\]/, /splitter\(0\.5\)/),
  formula('', /^error: the target is empty$/, /formula/),
  formula(`${'('.repeat(1000)}1${')'.repeat(1000)}`, /nested too deeply/, /fewer/),
  formula('foo\u001b[31m\nbar(2)', /./, /./),
];

const CHIPS: readonly Fault[] = [
  chip('', /nothing in it|empty/, /JSON/),
  chip('{"modes": 4,}', /not JSON/, /comma/),
  chip(NESTED, /nested/, /./),
  chip('[1]', /one JSON object/, /\{"modes": 4\}/),
  chip({}, /modes: is missing/, /number/),
  chip({ modes: 4.5 }, /modes: 4\.5 is not a whole number/, /whole number/),
  chip({ modes: 0 }, /modes: 0 is not a number of 1 or more/, /1 or more/),
  chip({ modes: 1e6 }, /modes: 1000000 is not a number of at most 1024/, /1024/),
  chip({ modes: 3, layuot: 'triangular' }, /layuot: unknown key/, /^Did you mean layout\?$/),
  chip(
    { modes: 3, layout: 'triangle' },
    /layout: "triangle" is not one of rectangular, triangular/,
    /^Did you mean triangular\?$/,
  ),
  chip(
    { modes: 3, cellStyle: { internl: 'upper' } },
    /cellStyle\.internl: unknown key/,
    /^Did you mean internal\?$/,
  ),
  chip(
    { modes: 3, lossDb: { splitter: -0.1 } },
    /lossDb\.splitter: -0\.1 is not a number of 0 or more/,
    /0 or more/,
  ),
  chip({ modes: 3, lossDb: { output: [0, 0, -1] } }, /lossDb\.output\[2\]: -1 is not/, /0 or more/),
  chip(
    { modes: 3, lossDb: { output: [1, 2] } },
    /lossDb\.output: there are 2 entries for 3 ports/,
    /each of the 3 ports/,
  ),
  chip({ modes: 3, portNames: ['a'] }, /portNames: there are 1 entries for 3 ports/, /each of the 3 ports/),
  chip({ modes: 3, couplingRatio: 1.01 }, /couplingRatio: 1\.01 is not a number of at most 1/, /at most 1/),
  chip({ modes: 3, couplingRatio: 'half' }, /couplingRatio: "half" is not a number/, /a number/),
  chip(
    { modes: 3, measuredCells: [{ cell: 1, couplingRatio: [0.5, 1.5] }] },
    /measuredCells\[0\]\.couplingRatio\[1\]: 1\.5/,
    /at most 1/,
  ),
  chip(
    { modes: 3, measuredCells: [{ cell: 1, couplingRatio: [0.5] }] },
    /measuredCells\[0\]\.couplingRatio/,
    /./,
  ),
  chip(
    { modes: 3, measuredCells: [{ cell: 4, couplingRatio: [0.5, 0.5] }] },
    /measuredCells\[0\]\.cell: there is no cell 4/,
    /1 to 3/,
  ),
  chip(
    {
      modes: 3,
      measuredCells: [
        { cell: 2, couplingRatio: [0.5, 0.5] },
        { cell: 2, couplingRatio: [0.4, 0.5] },
      ],
    },
    /measuredCells\[1\]\.cell: cell 2 is listed twice/,
    /one entry/,
  ),
  chip(
    { modes: 3, shifterOverrides: [{ shifter: 10, name: 'x' }] },
    /shifterOverrides\[0\]\.shifter: there is no shifter 10/,
    /1 to 9/,
  ),
  chip(
    { modes: 3, shifterLimits: { rangeRad: [2, 1] } },
    /shifterLimits\.rangeRad: the range runs from 2 down to 1/,
    /smaller end first/,
  ),
  chip({ modes: 3, format: 2 }, /format: this chip file has format 2/, /newer version/),
  chip({ modes: 3, format: '1' }, /format: "1" is not 1/, /./),
  chip({ 'modes': 3, '<b>\u001b[2J\n': 1 }, /unknown key/, /./),
  {
    name: 'chip missing',
    args: ['chip', 'nope.chip.json'],
    says: /nope\.chip\.json: there is no such file/,
    mends: /path/,
  },
  {
    name: 'chip with another ending',
    args: ['phases', 'dft(2)', '--chip', 'chip.yaml'],
    says: /chip\.yaml: a chip file ends in/,
    mends: /./,
  },
];

const TABLES: readonly Fault[] = [
  table([HEADER, ...ROWS.slice(1)], /t\.csv: there is no row for shifter 1/, /one row for every shifter/),
  table([HEADER], /t\.csv: 4 of 4 shifters have no row/, /one row/),
  table([HEADER, ...ROWS, ROWS[1]!], /t\.csv, row 5: shifter 2 is listed twice/, /one row/),
  table([HEADER, ...ROWS, '5,2,external,2,2,0,'], /t\.csv, row 5: there is no shifter 5/, /chip/),
  table(
    [HEADER, ROWS[0]!.replace('1,1,e', '1,2,e'), ...ROWS.slice(1)],
    /t\.csv, row 1: shifter 1 has cell 2, but 1/,
    /layout/,
  ),
  table(
    [HEADER, ROWS[0]!.replace(',0,', ',NaN,'), ...ROWS.slice(1)],
    /t\.csv, row 1: the phase is/,
    /finite number, in radians/,
  ),
  table(
    [HEADER, ROWS[0]!.replace(',0,', ',Infinity,'), ...ROWS.slice(1)],
    /t\.csv, row 1: the phase is Infinity/,
    /finite/,
  ),
  table(
    [HEADER, ROWS[0]!.replace(',0,', ',,'), ...ROWS.slice(1)],
    /t\.csv, row 1: the phase is empty/,
    /finite/,
  ),
  table(
    [HEADER, ROWS[0]!.replace(',0,', ',"0,5",'), ...ROWS.slice(1)],
    /t\.csv, row 1: the phase is/,
    /finite/,
  ),
  table(
    [HEADER, ROWS[0]!.replace('external', 'extrenal'), ...ROWS.slice(1)],
    /t\.csv, row 1: there is no role "extrenal"/,
    /external/,
  ),
  table([HEADER, '1,1,external,1', ...ROWS.slice(1)], /t\.csv, row 1: there are 4 fields, not 7/, /fields/),
  table(
    [HEADER.replace('phase_rad', 'phase_deg'), ...ROWS],
    /t\.csv: this is not a phase table: its first line is/,
    /phase_rad/,
  ),
  table(['#comment', HEADER, ...ROWS], /t\.csv: this is not a phase table/, /begins with/),
  table([HEADER, ...ROWS.slice(0, 3), '4,,output,,2,0,"open'], /t\.csv: this is not CSV/, /quotation/),
  {
    name: 'table of another format',
    args: ['verify', 't.json'],
    files: { 't.json': '{"format": 2, "shifters": []}' },
    says: /t\.json, format: this phase table has format 2/,
    mends: /newer version/,
  },
  {
    name: 'JSON that is no table',
    args: ['verify', 't.json'],
    files: { 't.json': '{"modes": 2}' },
    says: /t\.json: this JSON file has no format key of a phase table/,
    mends: /phases\.json/,
  },
  {
    name: 'table with a broken chip inside',
    args: ['verify', 't.json'],
    files: {
      't.json': '{"format": 1, "shifters": [], "chip": {"modes": 2, "mirorr": "none"}, "target": {}}',
    },
    says: /t\.json, chip\.mirorr: unknown key/,
    mends: /mirror/,
  },
  {
    name: 'table missing',
    args: ['figure', 'nope.csv'],
    says: /nope\.csv: there is no such file/,
    mends: /path/,
  },
  {
    name: 'lone table',
    args: ['figure', 't.csv'],
    files: { 't.csv': `${HEADER}\n${ROWS.join('\n')}` },
    says: /t\.csv: .*its chip is not known/,
    mends: /--chip/,
  },
];

const USAGE: readonly Fault[] = [
  {
    name: 'unknown command',
    args: ['phase', 'dft(2)'],
    says: /unknown command 'phase'/,
    mends: /Did you mean phases\?/,
  },
  {
    name: 'help for an unknown command',
    args: ['help', 'verfy'],
    says: /unknown command 'verfy'/,
    mends: /Did you mean verify\?/,
  },
  {
    name: 'unknown option',
    args: ['phases', 'dft(2)', '--laout', 'x'],
    says: /unknown option '--laout'/,
    mends: /--layout/,
  },
  {
    name: 'leading minus',
    args: ['phases', '-dft(2)'],
    says: /unknown option '-dft\(2\)'/,
    mends: /phases -- "-dft\(2\)"/,
  },
  { name: 'no argument', args: ['phases'], says: /missing required argument 'target'/, mends: /help phases/ },
  {
    name: 'two arguments',
    args: ['phases', 'dft(2)', '*', 'i'],
    says: /too many arguments/,
    mends: /quotes/,
  },
  {
    name: 'no value',
    args: ['phases', 'dft(2)', '--chip'],
    says: /--chip <file>' argument missing/,
    mends: /help phases/,
  },
  {
    name: 'empty path',
    args: ['phases', 'dft(2)', '--chip', ''],
    says: /--chip is empty/,
    mends: /leave it out/,
  },
  {
    name: 'wrong unit',
    args: ['phases', 'dft(2)', '--unit', 'grad'],
    says: /'grad' is invalid.*rad, pi, deg/,
    mends: /help phases/,
  },
  {
    name: 'chip and layout',
    args: ['phases', 'dft(2)', '--chip', 'x', '--layout', 'triangular'],
    says: /cannot be used with/,
    mends: /help phases/,
  },
  {
    name: 'unknown figure',
    args: ['phases', 'dft(2)', '--require', 'fidelty=1'],
    says: /no figure of merit fidelty/,
    mends: /fidelity/,
  },
  {
    name: 'no limit',
    args: ['phases', 'dft(2)', '--require', 'fidelity'],
    says: /--require fidelity/,
    mends: /fidelity=0\.99/,
  },
  {
    name: 'limit NaN',
    args: ['phases', 'dft(2)', '--require', 'fidelity=NaN'],
    says: /--require fidelity=NaN/,
    mends: /0\.99/,
  },
  {
    name: 'require without against',
    args: ['target', 'dft(2)', '--require', 'fidelity=1'],
    says: /none to judge/,
    mends: /--against/,
  },
  {
    name: 'no range of ports',
    args: ['phases', 'dft(2)', '--ports', '3', '--chip', 'four.chip.json'],
    files: { 'four.chip.json': '{"modes": 4}' },
    says: /"3" is not a range of ports/,
    mends: /3-6/,
  },
  {
    name: 'ports without a chip',
    args: ['phases', 'dft(2)', '--ports', '3-4'],
    says: /--ports needs a chip/,
    mends: /--chip/,
  },
  {
    name: 'tolerance no number',
    args: ['phases', 'dft(2)', '--unitary-within', 'low'],
    says: /--unitary-within low: this is not a number/,
    mends: /1e-6/,
  },
  {
    name: 'tolerance negative',
    args: ['phases', 'dft(2)', '--unitary-within', '-1'],
    says: /--unitary-within -1: this is not a positive number/,
    mends: /1e-6/,
  },
  {
    name: 'figure ending',
    args: ['figure', 't.csv', '--to', 'f.png'],
    says: /f\.png: figures are written as \.svg/,
    mends: /\.svg/,
  },
  {
    name: 'figure width',
    args: ['figure', 't.csv', '--width', 'wide'],
    says: /--width wide/,
    mends: /one-column/,
  },
  {
    name: 'target ending',
    args: ['target', 'dft(2)', '--to', 'f.mat'],
    says: /f\.mat: no matrix is written/,
    mends: /\.npy/,
  },
  {
    name: 'against another size',
    args: ['target', 'dft(2)', '--against', 'dft(3)'],
    says: /dft\(3\): this matrix has 3 ports, the target 2/,
    mends: /one size/,
  },
  { name: 'chip of nothing', args: ['chip'], says: /needs a file to check, or --modes/, mends: /--modes 8/ },
  {
    name: 'chip both ways',
    args: ['chip', 'c.chip.json', '--modes', '3'],
    says: /do not go together/,
    mends: /Leave out/,
  },
  {
    name: 'chip modes no number',
    args: ['chip', '--modes', 'four'],
    says: /--modes four: this is not a number/,
    mends: /number/,
  },
  {
    name: 'chip ratio',
    args: ['chip', '--modes', '4', '--coupling-ratio', '2'],
    says: /couplingRatio: 2 is not/,
    mends: /at most 1/,
  },
];

function filesOf({ args, files = {} }: Fault): Record<string, string | Uint8Array> {
  return args.includes('four.chip.json') ? { 'four.chip.json': '{"modes": 4}', ...files } : files;
}

/** The arguments, with a new folder for results that must not come to be. */
function argsOf({ args: [command = '', ...rest] }: Fault): string[] {
  return command === 'help' ? [command, ...rest] : [command, '--out', 'new/results', ...rest];
}

function expectFault({ says, mends }: Fault, run: CommandRun): void {
  const lines = run.stderr.split('\n');
  expect([run.code, run.stdout, lines.length, lines[2]], run.stderr).toEqual([2, '', 3, '']);
  expect(lines[0]).toMatch(/^error: ./);
  expect(lines[0]).toMatch(says);
  expect(lines[1]).toMatch(/^\S.*\S$/);
  expect(lines[1]).toMatch(mends);
  // Nothing of the program's own making: no stack, no names of its errors, no values of the host language.
  expect(run.stderr).not.toMatch(/ at .*[(:]\d+:\d+|\w+Error\b|undefined|\[object|node:|\u001b/);
  expect(run.listing.filter((name) => name.startsWith('new'))).toEqual([]);
}

for (const [title, faults] of Object.entries({ FILES, FORMULAS, CHIPS, TABLES, USAGE })) {
  describe(`bad ${title.toLowerCase()}: two lines, exit 2, nothing written`, () => {
    let runs: CommandRun[] = [];
    beforeAll(async () => {
      runs = await runMany(faults.map((fault) => ({ args: argsOf(fault), files: filesOf(fault) })));
    });
    it.each(faults.map((fault, k): [string, Fault, number] => [fault.name, fault, k]))(
      '%s',
      (_, fault, k) => {
        expectFault(fault, runs[k]!);
      },
    );
  });
}

describe.concurrent('bad standard input', () => {
  it.each([
    ['', /^error: standard input: there is no matrix/],
    ['1 0\n0\n', /standard input, row 2: 1 entry/],
    ['[[1, 0], [0', /standard input.*: this is not JSON/],
    ['{"modes": 4}', /standard input: this is a chip file/],
    ['\u0000\u0001', /standard input: this is not a text file/],
  ])('%j', async (input, says) => {
    const args = ['phases', '-'];
    expectFault(
      { name: '', args, says, mends: /./ },
      await runCommand([...args, '--out', 'new/results'], { input }),
    );
  });
});

describe.concurrent('bad surroundings', () => {
  it('a huge file is refused before it is read', async () => {
    const run = await runCommand(['target', 'dft(2)', '--quiet'], {
      files: { 'big.csv': '', 'big.chip.json': '' },
    });
    for (const name of ['big.csv', 'big.chip.json']) await truncate(join(run.folder, name), 50e9);
    for (const args of [
      ['phases', 'big.csv'],
      ['chip', 'big.chip.json'],
      ['verify', 'big.csv'],
    ]) {
      const { code, stderr } = await runCommand(args, { folder: run.folder });
      expect(code).toBe(2);
      expect(stderr).toMatch(/^error: big\.\S+: this is larger than 256 MB\n.*\.npy\.\n$/);
    }
  });

  it('a formula that takes too long is stopped', async () => {
    const start = performance.now();
    const fault = formula('inv(haar(500, 1)*haar(500, 2)*2)', /takes too long/, /as a file/);
    expectFault(fault, await runCommand(argsOf(fault)));
    expect(performance.now() - start).toBeLessThan(40_000);
  });

  it('--out below a file, or at a file, is refused, and the file stays', async () => {
    for (const place of ['f/r', 'f']) {
      const run = await runCommand(['target', 'dft(2)', '--out', place], { files: { f: 'mine' } });
      expect([run.code, run.stdout, run.listing]).toEqual([2, '', ['f']]);
      expect(run.stderr).toMatch(/^error: f(\/r)?: .*file.*\n.*place.*\n$/);
      expect(await run.read('f')).toBe('mine');
    }
  });

  it('--out where the system makes no folders is refused, and soon', async () => {
    // Node's own recursive mkdir never ends there.
    const run = await runCommand(['target', 'dft(2)', '--out', '/proc/phasewright/new']);
    expect([run.code, run.stdout]).toEqual([2, '']);
    expect(run.stderr).toMatch(/^error: \/proc\/phasewright\/new: .+\n.*place.*\n$/);
  });

  it('--to below a file, or at a folder, is refused, and no results are written', async () => {
    for (const place of ['f/m.csv', 'd.csv']) {
      const run = await runCommand(['target', 'dft(2)', '--to', place], {
        files: { 'f': 'mine', 'd.csv/x': '' },
      });
      expect([run.code, run.stdout, run.listing]).toEqual([2, '', ['d.csv/', 'd.csv/x', 'f']]);
      expect(run.stderr).toMatch(/^error: (f|d\.csv)\S*: .*(file|folder).*\n.+\n$/);
    }
  });

  it('--debug shows where an error arose, and only then', async () => {
    const folder = freshFolder();
    const [plain, debug] = await Promise.all([
      runCommand(['phases', 'nope.csv'], { folder }),
      runCommand(['phases', 'nope.csv', '--debug'], { folder }),
    ]);
    expect(debug.stderr.startsWith(plain.stderr)).toBe(true);
    expect(debug.stderr).toMatch(/\n {4}at /);
  });
});
