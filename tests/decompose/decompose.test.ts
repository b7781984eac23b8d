import { describe, expect, it } from 'vitest';
import type { Decomposition } from '../../src/decompose/Decomposition.js';
import { reconstruct } from '../../src/decompose/Decomposition.js';
import { decompose } from '../../src/decompose/decompose.js';
import { identityMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { lapackResidual } from '../support/lapackResidual.js';
import { createMesh, LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';
import {
  allPermutations,
  blockDiagonal,
  dft,
  nonlinearSignGate,
  permutation,
  reversal,
  unitaryMatrices,
  withNoise,
} from '../support/matrices.js';

function barPowers({ cosine }: Decomposition): number[] {
  return Array.from(cosine, (c) => c * c);
}

function expectClose(found: readonly number[], expected: readonly number[]): void {
  expect(found).toHaveLength(expected.length);
  found.forEach((value, k) => expect(value).toBeCloseTo(expected[k]!, 9));
}

describe.each(LAYOUTS)('%s: reconstruction', (layout) => {
  it.each([1, 2, 3, 4, 5, 7, 8, 13, 32])('of random and hard matrices in all mirrors, N = %i', (modes) => {
    for (const mirror of MIRRORS) {
      const mesh = createMesh(layout, modes, mirror);
      for (const [name, target] of unitaryMatrices(modes)) {
        // LAPACK's habit: 30 N eps; about 2 were the most seen.
        expect(
          lapackResidual(target, reconstruct(decompose(target, mesh))),
          `${name}, ${mirror}`,
        ).toBeLessThan(30);
      }
    }
  });

  it.each([64, 128, 256])("stays below LAPACK's bound, N = %i", (modes) => {
    for (const [name, target] of unitaryMatrices(modes)) {
      const mesh = createMesh(layout, modes);
      expect(lapackResidual(target, reconstruct(decompose(target, mesh))), name).toBeLessThan(30);
    }
  });

  it('leaves the target as it was', () => {
    const target = haarUnitary(6, 2);
    const before = target.re.slice();
    decompose(target, createMesh(layout, 6, 'columns'));
    decompose(target, createMesh(layout, 6));
    expect(target.re).toEqual(before);
  });

  it('refuses a target of another size', () => {
    expect(() => decompose(identityMatrix(3), createMesh(layout, 4))).toThrow(RangeError);
  });
});

describe.each(LAYOUTS)(
  '%s: degenerate targets give bar and cross states, not angles of rounding noise',
  (layout) => {
    const exact = (decomposition: Decomposition): boolean =>
      decomposition.cosine.every(
        (c, k) =>
          (c === 1 && decomposition.sineRe[k] === 0) || (c === 0 && Math.abs(decomposition.sineRe[k]!) === 1),
      ) && decomposition.sineIm.every((s) => s === 0);

    it('sets every cell to bar for the identity', () => {
      for (const mirror of MIRRORS) {
        const { cosine } = decompose(withNoise(identityMatrix(7)), createMesh(layout, 7, mirror));
        expect(Array.from(cosine)).toEqual(Array.from(cosine, () => 1));
      }
    });

    it('sets every cell to cross for the reversal of the ports', () => {
      for (const mirror of MIRRORS) {
        const { cosine } = decompose(withNoise(reversal(7)), createMesh(layout, 7, mirror));
        expect(Array.from(cosine)).toEqual(Array.from(cosine, () => 0));
      }
    });

    it('finds bar and cross states alone for every permutation of five ports', () => {
      for (const places of allPermutations(5)) {
        expect(exact(decompose(withNoise(permutation(places)), createMesh(layout, 5)))).toBe(true);
      }
    });

    it('keeps the blocks of a block-diagonal target apart', () => {
      const mesh = createMesh(layout, 5);
      const target = withNoise(blockDiagonal(haarUnitary(2, 3), haarUnitary(3, 4)));
      const { cosine } = decompose(target, mesh);
      // No light passes from ports 1, 2 to ports 3, 4, 5: 1 + 3 cells are at work, the others at bar or in
      // pairs of crosses.
      const working = Array.from(cosine).filter((c) => c !== 0 && c !== 1);
      expect(working.length).toBeLessThanOrEqual(4);
    });

    it('has real factors for a real target', () => {
      const { sineIm, diagonal } = decompose(unitaryMatrices(6)[5]![1], createMesh(layout, 6));
      expect(Math.max(...sineIm.map(Math.abs))).toBe(0);
      for (const phase of diagonal) expect(Math.abs(Math.sin(phase))).toBeLessThan(1e-15);
    });
  },
);

// check-values section 5; derived there and checked against an independent program to 1e-9.
describe('worked examples: bar powers', () => {
  it('of the Fourier transform of three ports, the tritter', () => {
    for (const layout of LAYOUTS) {
      expectClose(barPowers(decompose(dft(3), createMesh(layout, 3))), [1 / 2, 1 / 3, 1 / 2]);
    }
  });

  it('of the Fourier transform of four ports', () => {
    const triangular = barPowers(decompose(dft(4), createMesh('triangular', 4)));
    // In the order of the cells: columns 1, 2, 3 (ports 1-2, then 3-4), 4, 5.
    expectClose(triangular, [1 / 2, 1 / 3, 5 / 8, 1 / 4, 1 / 3, 1 / 2]);
    const rectangular = barPowers(decompose(dft(4), createMesh('rectangular', 4)));
    expectClose(rectangular, [1 / 2, 1 / 2, 1 / 3, 1 / 4, 1 / 4, 2 / 3]);
  });

  it('of the nonlinear-sign gate', () => {
    const powers = barPowers(decompose(nonlinearSignGate(), createMesh('triangular', 3)));
    expectClose(powers, [0.261203875, 0.8357864376, 0.261203875]);
  });

  it('of the last row of a triangle: |U_{N,m+1}|^2 over the sum up to m+1', () => {
    const modes = 6;
    const target = haarUnitary(modes, 21);
    const last = Array.from({ length: modes }, (_, j) => {
      const k = (modes - 1) * modes + j;
      return target.re[k]! ** 2 + target.im[k]! ** 2;
    });
    const { mesh, cosine } = decompose(target, createMesh('triangular', modes));
    for (let m = 1; m < modes; m++) {
      const cell = mesh.upperPortIndex.findIndex((port) => port === m - 1);
      const sum = last.slice(0, m + 1).reduce((a, b) => a + b, 0);
      expect(cosine[cell]! ** 2).toBeCloseTo(last[m]! / sum, 12);
    }
  });
});

// Russell, Chakhmakhchyan, O'Brien, Laing, New J. Phys. 19, 033007 (2017): the bar power R of each cell of a
// Haar-random target is independent with CDF 1-(1-R)^k. The exponents k are those of check-values section 3.
describe('Haar statistics of the cells', () => {
  const modes = 5;
  const samples = 5000;
  const exponent = {
    triangular: (_column: number, m: number) => m,
    rectangular: (l: number, m: number) => Math.min(2 * m, 2 * (modes - m), 2 * l - 1, 2 * (modes - l) + 1),
  };
  const targets = Array.from({ length: samples }, (_, k) => haarUnitary(modes, 1000 + k));

  it.each(LAYOUTS)('%s: Kolmogorov-Smirnov for every cell', (layout) => {
    const mesh = createMesh(layout, modes);
    const all = targets.map((target) => decompose(target, mesh).cosine);
    for (let cell = 0; cell < mesh.cells; cell++) {
      const k = exponent[layout](mesh.columnIndex[cell]! + 1, mesh.upperPortIndex[cell]! + 1);
      const uniform = all.map((cosine) => 1 - (1 - cosine[cell]! ** 2) ** k).sort((a, b) => a - b);
      const distance = uniform.reduce(
        (largest, u, i) => Math.max(largest, (i + 1) / samples - u, u - i / samples),
        0,
      );
      // The Kolmogorov quantile .9999 is 2.2253 (from Kolmogorov's series); ten cells a layout at a fixed
      // seed.
      expect(distance * Math.sqrt(samples), `cell ${cell + 1}`).toBeLessThan(2.2253);
    }
  });
});
