import { describe, expect, it } from 'vitest';
import { kindOfText, matrixFileKind } from '../../src/target/MatrixFileKind.js';
import { readMatrices } from '../../src/target/readMatrices.js';
import { bytesOf, faultOf, rowsFrom } from './support.js';

const EXCHANGE = [
  [
    [0, 0],
    [1, 0],
  ],
  [
    [0, 1],
    [0, 0],
  ],
];

describe('separated text', () => {
  it.each([
    ['commas', '0,1\n1i,0\n'],
    ['commas and blanks', ' 0 , 1 \n 1i , 0 \n'],
    ['semicolons', '0;1\n1j;0'],
    ['tabs', '0\t1\ni\t0\n'],
    ['a comma with a tab behind it', '0,\t1\ni,\t0\n'],
    ['blanks', '  0   1 \n 1i 0  \n'],
    ['blanks and a tab in front', '\t0 1\n\tj 0\n'],
    ['Windows line ends', '0,1\r\n1i,0\r\n'],
    ['old line ends', '0,1\r1i,0\r'],
    ['a byte order mark', '\ufeff0,1\n1i,0\n'],
    ['comments and empty lines', '# from # the lab\n\n0,1 % first\n   \n%\n1i,0# second\n\n'],
    ['quotes as a spreadsheet writes them', '"0","1"\n"1i","0"\n'],
    ['parentheses', '(0),(1+0j)\n(0+1j),(0-0j)\n'],
  ])('with %s', (_, text) => {
    expect(rowsFrom(text, 'csv').map((row) => row.map((entry) => entry.map((x) => x + 0)))).toEqual(EXCHANGE);
    expect(rowsFrom(text, 'tsv')).toEqual(rowsFrom(text, 'csv'));
    expect(rowsFrom(text, 'txt')).toEqual(rowsFrom(text, 'csv'));
  });

  it.each([
    ['0.5-0.5i', 0.5, -0.5],
    ['0.5 - 0.5i', 0.5, -0.5],
    ['(0.5-0.5j)', 0.5, -0.5],
    ['( 0.5 - 0.5j )', 0.5, -0.5],
    ['0.5+-0.5j', 0.5, -0.5],
    ['0.5 - 0.5im', 0.5, -0.5],
    ['-2im', 0, -2],
    ['1e-3', 1e-3, 0],
    ['1E+3-2e-3i', 1e3, -2e-3],
    ['.5', 0.5, 0],
    ['5.', 5, 0],
    ['+1', 1, 0],
    ['-i', -0, -1],
    ['0.5*i', 0, 0.5],
    ['-0.25 + i', -0.25, 1],
    ['\u22120.5', -0.5, 0],
    ['1/sqrt(2)', Math.SQRT1_2, 0],
    ['exp(i*pi/4)', Math.SQRT1_2, Math.SQRT1_2],
    ['cis(pi/2)/2', 0, 0.5],
    ['(1+i)/2', 0.5, 0.5],
    ['2^-1', 0.5, 0],
  ])('reads %s', (entry, re, im) => {
    const [row] = rowsFrom(`${entry},0\n0,1\n`, 'csv');
    expect(row![0]![0]).toBeCloseTo(re, 15);
    expect(row![0]![1]).toBeCloseTo(im, 15);
  });

  it('knows an entry in parentheses among blanks', () => {
    expect(rowsFrom('(0.5 - 0.5j) 0\n0 ( 1 + 2i )\n', 'txt')).toEqual([
      [
        [0.5, -0.5],
        [0, 0],
      ],
      [
        [0, 0],
        [1, 2],
      ],
    ]);
  });

  it.each([
    ['', 'target/empty', /no matrix/],
    ['\n \n# only a comment\n', 'target/empty', /no matrix/],
    ['1,0\n0\n', 'target/ragged', /row 2: 1 entry, but row 1 has 2/],
    ['1,0,0\n0,1,0\n', 'target/not-square', /2 rows and 3 columns/],
    ['1,0\n0,x1\n', 'target/unknown-name', /row 2, column 2: "x1"/],
    ['1,0\n0,1..2\n', 'target/entry', /row 2, column 2: "1\.\.2"/],
    ['1,0\n0,\n', 'target/entry', /row 2, column 2: there is no number/],
    ['1,nan\n0,1\n', 'target/not-finite', /row 1, column 2: the entry is nan/],
    ['1,0\n(nan+0j),1\n', 'target/not-finite', /row 2, column 1/],
    ['1,0\n1-infj,1\n', 'target/not-finite', /row 2, column 1/],
    ['1,-Infinity\n0,1\n', 'target/not-finite', /row 1, column 2/],
    ['1,1/0\n0,1\n', 'target/not-finite', /row 1, column 2/],
    ['1,1e999\n0,1\n', 'target/not-finite', /row 1, column 2/],
    ['1,1/2i\n0,1\n', 'target/ambiguous', /row 1, column 2.*two ways/],
    ['0,5;0\n0;0,5\n', 'target/entry', /row 1, column 1: "0,5" holds a comma/],
    ['a,b\n1,0\n0,1\n', 'target/header-row', /row 1.*"a"/],
    ['re,im\n1,0\n0,1\n', 'target/header-row', /"re"/],
    ['out 1,out 2\n1,0\n0,1\n', 'target/header-row', /"out 1"/],
    [
      'shifter,cell,role,column,port,phase_rad,name\n1,1,external,1,1,0,\n',
      'target/wrong-file',
      /phase table/,
    ],
    ['[1 0; 0 1]', 'target/separator', /starts with "\["/],
    ['"1,0\n0,1\n', 'target/quotes', /quotation mark/],
    ['0.5 - 0.5i 0\n0 1\n', 'target/blanks-in-entry', /row 1, column 2: "-"/],
    [`1,${'y'.repeat(500)}\n0,1\n`, 'target/unknown-name', /y{40}\.\.\.[^y]/],
  ])('refuses %j', (text, code, message) => {
    expect(faultOf(() => readMatrices(bytesOf(text), 'csv'), code).message).toMatch(message);
  });

  it('tells how to write entries when blanks tear them apart', () => {
    const fault = faultOf(() => readMatrices(bytesOf('0.5 -0.5i 0\n0 1 0\n'), 'txt'), 'target/not-square');
    expect(fault.remedy).toMatch(/without blanks inside/);
  });

  it.each([
    ['1,0,\n0,1,\n', 'target/not-square', /no row with a separator/],
    ['1,0\n0,1,\n', 'target/ragged', /no row with a separator/],
    ['1, 0; 0, 1\n', 'target/not-square', /one row of the matrix a line/],
  ])('tells what may be wrong with the shape of %j', (text, code, remedy) => {
    expect(faultOf(() => readMatrices(bytesOf(text), 'csv'), code).remedy).toMatch(remedy);
  });

  it('names row and column as data for programs', () => {
    expect(faultOf(() => readMatrices(bytesOf('1,0\n0,?\n'), 'csv'), 'target/entry').place).toEqual({
      row: 2,
      column: 2,
    });
  });

  it('takes i, j, e and pi in the first row for numbers, not for a header', () => {
    expect(rowsFrom('i,e\npi,j\n', 'csv')).toEqual([
      [
        [0, 1],
        [Math.E, 0],
      ],
      [
        [Math.PI, 0],
        [0, 1],
      ],
    ]);
  });

  it.each([
    ['NUL bytes', Uint8Array.of(0x31, 0, 0x2c)],
    ['UTF-16', Uint8Array.of(0xff, 0xfe, 0x31, 0x00)],
    ['Latin-1', Uint8Array.of(0x31, 0x2c, 0xe9, 0x0a)],
  ])('refuses %s', (_, bytes) => {
    faultOf(() => readMatrices(bytes, 'csv'), 'input/not-text');
    faultOf(() => readMatrices(bytes, 'json'), 'input/not-text');
    faultOf(() => readMatrices(bytes, 'mtx'), 'input/not-text');
  });

  it('bounds the size before it parses', () => {
    const limits = { maxModes: 4 };
    const row = `${'1,'.repeat(4)}1\n`;
    faultOf(() => readMatrices(bytesOf(row.repeat(5)), 'csv', limits), 'target/too-large');
    faultOf(() => readMatrices(bytesOf(row), 'csv', limits), 'target/too-large');
    faultOf(() => readMatrices(bytesOf(`1,${'0'.repeat(2e6)}`), 'csv', limits), 'target/too-large');
    expect(() => readMatrices(bytesOf('1'), 'csv', { maxModes: NaN })).toThrow(RangeError);
  });
});

describe('kinds of files', () => {
  it('are known by the ending, in capitals or not', () => {
    expect(['a.csv', 'b.TSV', 'c.d.txt', 'x.JSON', 'y.Npy', './z.mtx'].map(matrixFileKind)).toEqual([
      'csv',
      'tsv',
      'txt',
      'json',
      'npy',
      'mtx',
    ]);
    expect(['csv', 'a.csv.gz', 'folder.csv/name', 'a.', '', 'a.constructor'].map(matrixFileKind)).toEqual(
      Array(6).fill(undefined),
    );
  });

  it('are told apart by their first bytes on standard input', () => {
    expect(kindOfText(bytesOf('\ufeff \n [[1]]'))).toBe('json');
    expect(kindOfText(bytesOf('{"matrix": 1}'))).toBe('json');
    expect(kindOfText(bytesOf('1,0\n0,1'))).toBe('csv');
    expect(kindOfText(bytesOf(''))).toBe('csv');
    expect(kindOfText(bytesOf('%%MatrixMarket matrix'))).toBe('mtx');
    expect(kindOfText(bytesOf('% a comment\n1'))).toBe('csv');
    expect(kindOfText(Uint8Array.of(0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0))).toBe('npy');
  });
});
