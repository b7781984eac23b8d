import { readdirSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';
import { matrixFileKind } from '../../src/target/MatrixFileKind.js';
import { readMatrices } from '../../src/target/readMatrices.js';
import { EXPECTED, faultOf, fixture, rowsOf } from './support.js';

// Files and expected values: NumPy and SciPy, by the script in tests/fixtures/target/README.md.
const NAMES = readdirSync(new URL('../fixtures/target/', import.meta.url));
const MATRIX_FILES = NAMES.filter((name) => !/^(README\.md|expected\.json)$/.test(name));

describe('files written by NumPy and SciPy', () => {
  it('are all expected or refused', () => {
    const good = MATRIX_FILES.filter((name) => !name.startsWith('bad-'));
    expect(good.sort()).toEqual(Object.keys(EXPECTED).sort());
    expect(good.length).toBeGreaterThan(35);
  });

  it.each(Object.keys(EXPECTED))('%s reads to the last bit', (name) => {
    const matrices = readMatrices(fixture(name), matrixFileKind(name)!);
    // + 0 makes -0 into 0: mirrored entries of Matrix Market files have no sign of their own.
    const plain = (value: number): number => value + 0;
    expect(matrices.map((m) => rowsOf(m).map((row) => row.map((entry) => entry.map(plain))))).toEqual(
      EXPECTED[name]!.map((m) => m.map((row) => row.map((entry) => entry.map(plain)))),
    );
  });

  it('keeps the sign of a zero and subnormal halves', () => {
    const [matrix] = readMatrices(fixture('f2-special.npy'), 'npy');
    expect([...matrix!.re]).toEqual([2 ** -24, -(2 ** -14), 65504, -0]);
  });

  it.each([
    ['bad-object.npy', 'target/npy-object', /Python objects/],
    ['bad-vector.npy', 'target/not-square', /shape \(3,\)/],
    ['bad-shape.npy', 'target/not-square', /2 rows and 3 columns/],
    ['bad-scalar.npy', 'target/not-square', /shape \(\)/],
    ['bad-four.npy', 'target/not-square', /shape \(1, 1, 2, 2\)/],
    ['bad-records.npy', 'target/npy', /records/],
    ['bad-nan.npy', 'target/not-finite', /row 2, column 1.*NaN/],
    ['bad-text.npy', 'target/npy', /"<U1"/],
  ])('%s is refused as %s', (name, code, message) => {
    expect(faultOf(() => readMatrices(fixture(name), 'npy'), code).message).toMatch(message);
  });

  it('reads from a view into a larger buffer', () => {
    const bytes = fixture('c16.npy');
    const larger = new Uint8Array(bytes.length + 13).fill(7);
    larger.set(bytes, 5);
    const view = larger.subarray(5, 5 + bytes.length);
    expect(rowsOf(readMatrices(view, 'npy')[0]!)).toEqual(EXPECTED['c16.npy']![0]);
  });
});

describe('damaged files', () => {
  const kinds = ['csv', 'txt', 'json', 'npy', 'mtx'] as const;

  /** The number of ports read, or null when the file was refused. */
  function outcome(bytes: Uint8Array, kind: (typeof kinds)[number]): number | null {
    try {
      return readMatrices(bytes, kind, { maxModes: 16 })[0]!.rows;
    } catch (error) {
      if (error instanceof InputError) return null;
      throw error;
    }
  }

  it.each(MATRIX_FILES)('%s cut at any length throws nothing but InputError', (name) => {
    const bytes = fixture(name);
    const kind = matrixFileKind(name) as (typeof kinds)[number];
    const whole = outcome(bytes, kind);
    for (let length = 0; length < bytes.length; length++) {
      const result = outcome(bytes.subarray(0, length), kind);
      // A binary file without its end never passes. Text may lose its last digits unseen, or be cut within
      // its first entry and be a matrix of one port; but it never loses a row.
      const accepted = kind === 'npy' ? [null] : [null, 1, whole];
      expect(accepted, `cut at ${length}`).toContain(result);
    }
  });

  it('with one byte changed throw nothing but InputError', () => {
    for (const name of MATRIX_FILES) {
      const bytes = fixture(name);
      const kind = matrixFileKind(name) as (typeof kinds)[number];
      for (let k = 0; k < bytes.length; k += 3) {
        const damaged = bytes.slice();
        damaged[k] = (damaged[k]! * 31 + k + 1) % 256;
        outcome(damaged, kind);
      }
    }
  });

  it('under a wrong ending throw nothing but InputError', () => {
    for (const name of MATRIX_FILES) for (const kind of kinds) outcome(fixture(name), kind);
  });
});
