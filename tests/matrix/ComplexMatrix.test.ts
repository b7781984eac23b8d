import { describe, expect, it } from 'vitest';
import { copyMatrix, identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';

describe('matrixFromRows', () => {
  it('puts entry (row, column) at row * columns + column of both planes', () => {
    const matrix = matrixFromRows([
      [1, [2, 3], [0, -4]],
      [[5, 6], 7, 8],
    ]);
    expect(matrix).toEqual({
      rows: 2,
      columns: 3,
      re: Float64Array.of(1, 2, 0, 5, 7, 8),
      im: Float64Array.of(0, 3, -4, 6, 0, 0),
    });
  });

  it('refuses rows of different lengths, counting them from 1', () => {
    expect(() => matrixFromRows([[1, 2], [3]])).toThrow(new RangeError('row 2 has 1 entries, row 1 has 2'));
  });

  it('makes an empty matrix of no rows', () => {
    expect(matrixFromRows([])).toMatchObject({ rows: 0, columns: 0 });
  });
});

describe('zeroMatrix, identityMatrix, copyMatrix', () => {
  it('have the shape asked for', () => {
    expect(zeroMatrix(2, 3).re).toEqual(new Float64Array(6));
    expect(zeroMatrix(2, 3).im).toEqual(new Float64Array(6));
    expect(identityMatrix(3)).toEqual(
      matrixFromRows([
        [1, 0, 0],
        [0, 1, 0],
        [0, 0, 1],
      ]),
    );
  });

  it('copies share nothing with the original', () => {
    const original = identityMatrix(2);
    const copy = copyMatrix(original);
    copy.re[0] = 5;
    copy.im[3] = 6;
    expect(original).toEqual(identityMatrix(2));
  });
});
