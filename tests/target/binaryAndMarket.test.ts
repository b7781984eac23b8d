import { describe, expect, it } from 'vitest';
import { readMatrices } from '../../src/target/readMatrices.js';
import { bytesOf, faultOf, fixture, rowsFrom } from './support.js';

/** An .npy file of version 1.0 with this dictionary and this many zero bytes behind it. */
function npy(dictionary: string, dataLength: number): Uint8Array {
  const header = bytesOf(dictionary);
  const bytes = new Uint8Array(10 + header.length + dataLength);
  bytes.set([0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0, header.length & 255, header.length >> 8]);
  bytes.set(header, 10);
  return bytes;
}

describe('NumPy headers', () => {
  it('take keys in any order, either quotes, and no comma at the end', () => {
    const [matrix] = readMatrices(npy(`{"shape":(2,2),"fortran_order":True,"descr":"<f4"}`, 16), 'npy');
    expect([...matrix!.re]).toEqual([0, 0, 0, 0]);
  });

  it.each([
    [`{'descr': '|O', 'fortran_order': False, 'shape': (2, 2), }`, 32, 'target/npy-object', /pickled/],
    [`{'descr': '<f16', 'fortran_order': False, 'shape': (1, 1), }`, 16, 'target/npy', /"<f16"/],
    [`{'descr': '=f8', 'fortran_order': False, 'shape': (1, 1), }`, 8, 'target/npy', /"=f8"/],
    [`{'descr': '|f8', 'fortran_order': False, 'shape': (1, 1), }`, 8, 'target/npy', /"\|f8"/],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (1, 1), }`, 7, 'target/truncated', /7 bytes of 8/],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (1, 1), }`, 9, 'target/npy', /1 bytes follow/],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (0, 0), }`, 0, 'target/empty', /no matrix/],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (0, 2, 2), }`, 0, 'target/empty', /no matrix/],
    [
      `{'descr': '<f8', 'fortran_order': False, 'shape': (999999, 999999), }`,
      8,
      'target/too-large',
      /999999/,
    ],
    [
      `{'descr': '<f8', 'fortran_order': False, 'shape': (99999999, 9, 9), }`,
      8,
      'target/too-large',
      /99999999/,
    ],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (-1, 2), }`, 8, 'target/npy', /cannot be read/],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (2,, 2), }`, 8, 'target/npy', /whole numbers/],
    [`{'descr': '<f8', 'fortran_order': 0, 'shape': (1, 1), }`, 8, 'target/npy', /cannot be read/],
    [`{'descr': '<f8', 'fortran_order': False}`, 8, 'target/npy', /lacks/],
    [`{'descr': '<f8', 'descr': '<f8', 'fortran_order': False, 'shape': (1, 1)}`, 8, 'target/npy', /"descr"/],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (1, 1), 'x': 1}`, 8, 'target/npy', /"x"/],
    [`{'descr': '<f8', 'fortran_order': False, 'shape': (1, 1)} exit()`, 8, 'target/npy', /goes on/],
    [`__import__('os')`, 8, 'target/npy', /lacks a "\{"/],
  ])('refuse %s', (dictionary, length, code, message) => {
    expect(faultOf(() => readMatrices(npy(dictionary, length), 'npy'), code).message).toMatch(message);
  });

  it('refuse other magic, later versions, and headers that are too long', () => {
    const version4 = fixture('c16.npy');
    version4[6] = 4;
    expect(faultOf(() => readMatrices(version4, 'npy'), 'target/npy').message).toMatch(/version 4/);
    faultOf(() => readMatrices(bytesOf('1,0\n0,1\n'), 'npy'), 'target/npy');
    const long = fixture('c16-version2.npy');
    long.set([0, 0, 1, 1], 8);
    expect(faultOf(() => readMatrices(long, 'npy'), 'target/npy').message).toMatch(/bytes long/);
  });
});

const HEAD = '%%MatrixMarket matrix';

describe('Matrix Market', () => {
  it('reads capitals, comments, empty lines and Windows line ends', () => {
    const text = `%%MatrixMarket MATRIX Coordinate Integer General\r\n% a\r\n\r\n2 2 2\r\n%b\r\n1 2 3\r\n\r\n 2   1  -4 \r\n`;
    expect(rowsFrom(text, 'mtx')).toEqual([
      [
        [0, 0],
        [3, 0],
      ],
      [
        [-4, 0],
        [0, 0],
      ],
    ]);
  });

  it.each([
    ['', 'target/empty', /no matrix/],
    ['1 0\n0 1\n', 'target/mtx', /line 1.*MatrixMarket/],
    [`${HEAD} array complex\n`, 'target/mtx', /not a known kind/],
    [`${HEAD} array quaternion general\n`, 'target/mtx', /not a known kind/],
    [`${HEAD} array pattern general\n1 1\n`, 'target/mtx', /do not go together/],
    [`${HEAD} coordinate pattern skew-symmetric\n1 1 0\n`, 'target/mtx', /do not go together/],
    [`${HEAD} array real hermitian\n1 1\n1\n`, 'target/mtx', /do not go together/],
    [`${HEAD} array real general\n`, 'target/truncated', /sizes is missing/],
    [`${HEAD} array real general\n2 2 4\n`, 'target/mtx', /line 2.*3 numbers, not 2/],
    [`${HEAD} array real general\n-2 2\n`, 'target/mtx', /"-2" is not a whole number/],
    [`${HEAD} array real general\n2 3\n`, 'target/not-square', /2 rows and 3 columns/],
    [`${HEAD} array real general\n999999 999999\n`, 'target/too-large', /999999/],
    [`${HEAD} array real general\n0 0\n`, 'target/empty', /no matrix/],
    [`${HEAD} array real general\n2 2\n1\n0\n0\n`, 'target/truncated', /entry \(2, 2\)/],
    [`${HEAD} array real general\n1 1\n1\n1\n`, 'target/mtx', /line 4: there are more/],
    [`${HEAD} array real general\n1 1\n1 2\n`, 'target/mtx', /line 3: 2 numbers/],
    [`${HEAD} array real general\n1 1\none\n`, 'target/mtx', /line 3: "one"/],
    [`${HEAD} array integer general\n1 1\n1.5\n`, 'target/mtx', /"1.5" is not a number of the kind integer/],
    [`${HEAD} array complex general\n1 1\n1 nan\n`, 'target/not-finite', /row 1, column 1/],
    [`${HEAD} array real general\n1 1\n1e999\n`, 'target/not-finite', /row 1, column 1/],
    [`${HEAD} coordinate real general\n2 2 1\n3 1 1\n`, 'target/mtx', /line 3: row 3 lies outside 1 to 2/],
    [`${HEAD} coordinate real general\n2 2 1\n1 0 1\n`, 'target/mtx', /column 0 lies outside/],
    [
      `${HEAD} coordinate real general\n2 2 2\n1 1 1\n1 1 1\n`,
      'target/mtx',
      /line 4: entry \(1, 1\) is given twice/,
    ],
    [`${HEAD} coordinate real general\n2 2 5\n`, 'target/mtx', /5 entries are announced/],
    [`${HEAD} coordinate real general\n2 2 2\n1 1 1\n`, 'target/truncated', /1 of 2 entries/],
    [`${HEAD} coordinate real general\n2 2 1\n1 1\n`, 'target/mtx', /0 numbers stand where/],
    [`${HEAD} coordinate real symmetric\n2 2 1\n1 2 1\n`, 'target/mtx', /above the diagonal/],
    [`${HEAD} coordinate real skew-symmetric\n2 2 1\n1 1 1\n`, 'target/mtx', /no entries on its diagonal/],
    [`${HEAD} coordinate complex hermitian\n1 1 1\n1 1 1 1\n`, 'target/mtx', /diagonal of a hermitian/],
  ])('refuses %j', (text, code, message) => {
    expect(faultOf(() => readMatrices(bytesOf(text), 'mtx'), code).message).toMatch(message);
  });
});
