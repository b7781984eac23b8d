import { describe, expect, it } from 'vitest';
import { copyMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { normaliseInPlace, projectOutInPlace } from '../../src/matrix/projectOut.js';
import { normalMatrix } from './support.js';

describe('projectOutInPlace', () => {
  it('takes the first rows of the basis out of a vector and touches nothing else', () => {
    const basis = haarUnitary(6, 1);
    const kept = copyMatrix(basis);
    const vectors = normalMatrix(3, 6, 2);
    const before = copyMatrix(vectors);
    projectOutInPlace(vectors.re, vectors.im, 6, basis.re, basis.im, 4, 6);
    expect(basis).toEqual(kept);
    for (let row = 0; row < 6; row++) {
      const [wasRe, wasIm] = component(before, row);
      const [isRe, isIm] = component(vectors, row);
      const [re, im] = row < 4 ? [0, 0] : [wasRe, wasIm];
      expect(Math.hypot(isRe - re, isIm - im)).toBeLessThan(20 * Number.EPSILON);
    }
    for (const k of [0, 5, 12, 17]) expect(vectors.re[k]).toBe(before.re[k]);

    /** conj(basis row) . vector 2 */
    function component({ re, im }: { re: Float64Array; im: Float64Array }, row: number): [number, number] {
      let [sumRe, sumIm] = [0, 0];
      for (let k = 0; k < 6; k++) {
        const [br, bi] = [kept.re[6 * row + k]!, kept.im[6 * row + k]!];
        sumRe += br * re[6 + k]! + bi * im[6 + k]!;
        sumIm += br * im[6 + k]! - bi * re[6 + k]!;
      }
      return [sumRe, sumIm];
    }
  });
});

describe('normaliseInPlace', () => {
  it('divides one row by its length, and leaves zeros alone', () => {
    const re = Float64Array.of(9, 3, 0, 0, 0);
    const im = Float64Array.of(9, 0, 4, 0, 0);
    expect(normaliseInPlace(re, im, 1, 2)).toBe(5);
    expect(normaliseInPlace(re, im, 3, 2)).toBe(0);
    expect([...re]).toEqual([9, 0.6, 0, 0, 0]);
    expect([...im]).toEqual([9, 0, 0.8, 0, 0]);
  });
});
