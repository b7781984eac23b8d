import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { MATRIX_FILE_KINDS } from '../../src/target/MatrixFileKind.js';
import { readMatrices } from '../../src/target/readMatrices.js';
import { writeMatrix } from '../../src/target/writeMatrix.js';
import { fixture } from './support.js';

/** Any finite doubles: subnormal, huge, whole and -0 among them. */
const finite = fc.double({ noNaN: true, noDefaultInfinity: true });
const square = fc.integer({ min: 1, max: 6 }).chain((modes) =>
  fc
    .tuple(
      fc.array(finite, { minLength: modes ** 2, maxLength: modes ** 2 }),
      fc.array(finite, { minLength: modes ** 2, maxLength: modes ** 2 }),
    )
    .map(([re, im]): ComplexMatrix => ({
      rows: modes,
      columns: modes,
      re: Float64Array.from(re),
      im: Float64Array.from(im),
    })),
);

describe('writing a matrix', () => {
  it.each(MATRIX_FILE_KINDS)('%s reads back to the same bits', (kind) => {
    fc.assert(
      fc.property(square, (matrix) => {
        const [back, ...more] = readMatrices(writeMatrix(matrix, kind), kind);
        expect(more).toEqual([]);
        // toEqual tells 0 from -0.
        expect(back).toEqual(matrix);
      }),
      { numRuns: 150, seed: 7 },
    );
  });

  it('writes .npy as NumPy does, byte for byte', () => {
    const bytes = fixture('c16.npy');
    expect(writeMatrix(readMatrices(bytes, 'npy')[0]!, 'npy')).toEqual(bytes);
  });

  it('writes text as documented', () => {
    const matrix = matrixFromRows([
      [0.5, [0, -0.5]],
      [
        [-0, 1e-7],
        [1, 2],
      ],
    ]);
    const text = (kind: 'csv' | 'tsv' | 'txt' | 'json' | 'mtx'): string =>
      new TextDecoder().decode(writeMatrix(matrix, kind));
    expect(text('csv')).toBe('0.5+0j,0-0.5j\n-0+1e-7j,1+2j\n');
    expect(text('tsv')).toBe('0.5+0j\t0-0.5j\n-0+1e-7j\t1+2j\n');
    expect(text('txt')).toBe('0.5+0j 0-0.5j\n-0+1e-7j 1+2j\n');
    expect(JSON.parse(text('json'))).toEqual({
      matrix: [
        [
          [0.5, 0],
          [0, -0.5],
        ],
        [
          [-0, 1e-7],
          [1, 2],
        ],
      ],
    });
    expect(text('mtx')).toBe(
      '%%MatrixMarket matrix array complex general\n2 2\n0.5 0\n-0 1e-7\n0 -0.5\n1 2\n',
    );
  });

  it('refuses what no reader would take', () => {
    const matrix = zeroMatrix(1, 1);
    matrix.im[0] = NaN;
    for (const kind of MATRIX_FILE_KINDS) expect(() => writeMatrix(matrix, kind)).toThrow(RangeError);
  });
});
