import { describe, expect, it } from 'vitest';
import { loadKernels } from '../../src/kernel/loadKernels.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { matrixFromRows } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import type { Layout } from '../../src/mesh/Mesh.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { dft } from '../support/matrices.js';

interface Nulled {
  readonly cosine: number[];
  readonly sineRe: number[];
  readonly sineIm: number[];
  /** re and im of the diagonal entries. */
  readonly entries: number[];
  /** Whether a double that is not the kernel's has changed. */
  readonly trespassed: boolean;
}

/**
 * Runs a kernel with `filler` in the places around the matrix where it may write, and guards around all
 * arrays.
 */
function nullMatrix(layout: Layout, matrix: ComplexMatrix, negligible: number, filler: number): Nulled {
  const { rows: modes } = matrix;
  const cells = (modes * (modes - 1)) / 2;
  const memory = loadKernels();
  const guard = 16;
  const rowLength = 8 * (Math.ceil(modes / 4) | 1);
  const lengths = [(modes + 3) * rowLength, 2 * cells, 4 * Math.max(0, modes - 1), 3 * cells, 2 * modes];
  const addresses = lengths.map((length) => memory.reserve(length + 2 * guard) + 8 * guard);
  const whole = addresses.map((address, k) => memory.doubles(address - 8 * guard, lengths[k]! + 2 * guard));
  whole.forEach((view) => view.fill(-5));
  const [tiles, reaches, , results, entries] = whole.map((view) => view.subarray(guard, view.length - guard));
  tiles!.fill(filler);
  reaches!.fill(0);
  for (let i = 0; i < modes; i++) {
    for (let j = 0; j < modes; j++) {
      // Two columns to a tile: re, re', im, im'.
      const at = (i + 3) * rowLength + 4 * Math.floor(j / 2) + (j % 2);
      tiles![at] = matrix.re[i * modes + j]!;
      tiles![at + 2] = matrix.im[i * modes + j]!;
    }
  }
  const { nullRectangular, nullTriangular } = memory.kernels;
  const nulling = layout === 'rectangular' ? nullRectangular : nullTriangular;
  const [matrixAddress, reach, sweep, resultsAddress, entriesAddress] = addresses;
  const rowZero = matrixAddress! + 3 * 8 * rowLength;
  nulling(modes, rowZero, 8 * rowLength, negligible ** 2, reach!, sweep!, resultsAddress!, entriesAddress!);
  const [cosine, sineRe, sineIm] = [0, 1, 2].map((k) =>
    Array.from(results!.subarray(k * cells, (k + 1) * cells)),
  );
  return {
    cosine: cosine!,
    sineRe: sineRe!,
    sineIm: sineIm!,
    entries: Array.from(entries!),
    trespassed: whole.some((view) =>
      [...view.subarray(0, guard), ...view.subarray(view.length - guard)].some((value) => value !== -5),
    ),
  };
}

describe.each(LAYOUTS)('the nulling kernel, %s', (layout) => {
  it('leaves alone what is not its own and does not look at what it scribbles on, N = 1..64', () => {
    for (let modes = 1; modes <= 64; modes++) {
      const matrix = haarUnitary(modes, 8);
      const clean = nullMatrix(layout, matrix, 1e-13, 0);
      expect(clean.trespassed, `N = ${modes}`).toBe(false);
      expect(nullMatrix(layout, matrix, 1e-13, NaN), `N = ${modes}`).toEqual(clean);
    }
  });

  it('leaves phases on the diagonal, and unit factors', () => {
    const { cosine, sineRe, sineIm, entries } = nullMatrix(layout, haarUnitary(23, 9), 1e-13, 0);
    cosine.forEach((c, k) => expect(c ** 2 + sineRe[k]! ** 2 + sineIm[k]! ** 2).toBeCloseTo(1, 14));
    for (let k = 0; k < entries.length; k += 2) {
      expect(Math.hypot(entries[k]!, entries[k + 1]!)).toBeCloseTo(1, 13);
    }
  });

  // check-values section 5; derived there and checked against an independent program to 1e-9.
  it('gives the bar powers of the Fourier transforms of three and four ports', () => {
    const expected: Record<Layout, number[][]> = {
      rectangular: [
        [1 / 2, 1 / 3, 1 / 2],
        [1 / 2, 1 / 2, 1 / 3, 1 / 4, 1 / 4, 2 / 3],
      ],
      triangular: [
        [1 / 2, 1 / 3, 1 / 2],
        [1 / 2, 1 / 3, 5 / 8, 1 / 4, 1 / 3, 1 / 2],
      ],
    };
    [3, 4].forEach((modes, at) => {
      const { cosine } = nullMatrix(layout, dft(modes), 1e-13, 0);
      cosine.forEach((c, k) => expect(c * c).toBeCloseTo(expected[layout][at]![k]!, 13));
    });
  });

  // For two ports the factor is read off the second row: W = [[c, -conj s], [s, c]] up to phases in front, so
  // c = |U22| and s = U21 conj(U22)/|U22|.
  it('reads the one factor of two ports off the second row', () => {
    const matrix = haarUnitary(2, 10);
    const [, , re21, re22] = matrix.re;
    const [, , im21, im22] = matrix.im;
    const { cosine, sineRe, sineIm } = nullMatrix(layout, matrix, 1e-15, 0);
    const length = Math.hypot(re22!, im22!);
    expect(cosine[0]).toBeCloseTo(length, 14);
    expect(sineRe[0]).toBeCloseTo((re21! * re22! + im21! * im22!) / length, 14);
    expect(sineIm[0]).toBeCloseTo((im21! * re22! - re21! * im22!) / length, 14);
  });

  it('counts entries up to the tolerance as zero, and no larger ones', () => {
    const rotation = (sine: number, cosine: number): ComplexMatrix =>
      matrixFromRows([
        [cosine, -sine],
        [sine, cosine],
      ]);
    const factor = (sine: number, cosine: number): number[] => {
      const found = nullMatrix(layout, rotation(sine, cosine), 1e-9, 0);
      return [found.cosine[0]!, found.sineRe[0]!, found.sineIm[0]!];
    };
    expect(factor(0.99e-9, 1)).toEqual([1, 0, 0]);
    expect(factor(1.01e-9, 1)).toEqual([1, 1.01e-9, 0].map((value) => expect.closeTo(value, 20) as number));
    expect(factor(1, 0.99e-9)).toEqual([0, 1, 0]);
    expect(factor(1, 1.01e-9)).toEqual([1.01e-9, 1, 0].map((value) => expect.closeTo(value, 20) as number));
    expect(factor(0, 0)).toEqual([1, 0, 0]);
  });
});

describe('the kernel that lays a matrix out', () => {
  it('puts two columns to a tile, zeros around them, transposed and turned round by negative steps', () => {
    const memory = loadKernels();
    const source = memory.reserve(18);
    const rowLength = 8;
    const matrix = memory.reserve(6 * rowLength);
    memory.doubles(source, 18).set([11, 12, 13, 21, 22, 23, 31, 32, 33]);
    memory.doubles(source, 18).set([-11, -12, -13, -21, -22, -23, -31, -32, -33], 9);
    const rows = memory.doubles(matrix, 6 * rowLength);
    const layOut = (first: number, rowStep: number, columnStep: number): number[] => {
      rows.fill(NaN);
      const rowZero = matrix + 8 * 3 * rowLength;
      memory.kernels.layOutMatrix(3, source, first, rowStep, columnStep, rowZero, 8 * rowLength);
      expect(Array.from(rows.subarray(0, 3 * rowLength)).every((value) => value === 0)).toBe(true);
      return Array.from(rows.subarray(3 * rowLength));
    };
    const tiles = (a: number, b: number, c: number): number[] => [a, b, -a, -b, c, 0, -c, 0];
    expect(layOut(0, 3, 1)).toEqual([...tiles(11, 12, 13), ...tiles(21, 22, 23), ...tiles(31, 32, 33)]);
    expect(layOut(8, -1, -3)).toEqual([...tiles(33, 23, 13), ...tiles(32, 22, 12), ...tiles(31, 21, 11)]);
  });
});
