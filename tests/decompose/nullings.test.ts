import { describe, expect, it } from 'vitest';
import type { Decomposition } from '../../src/decompose/Decomposition.js';
import { reconstruct } from '../../src/decompose/Decomposition.js';
import { decomposeWith } from '../../src/decompose/decomposeWith.js';
import type { Nulling } from '../../src/decompose/Nulling.js';
import { nullOnKernels } from '../../src/decompose/nullOnKernels.js';
import { nullReadably } from '../../src/decompose/nullReadably.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { lapackResidual } from '../support/lapackResidual.js';
import { createMesh, LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';
import { unitaryMatrices } from '../support/matrices.js';

const NULLINGS: readonly (readonly [name: string, nulling: Nulling])[] = [
  ['on kernels', nullOnKernels],
  ['readable twin', nullReadably],
];
const SIZES = Array.from({ length: 65 }, (_, modes) => modes);

/**
 * The cells of which only bar or cross can be right: those of the identity and of a reversal, with noise or
 * without.
 */
const ONLY_STATE: Readonly<Record<string, number>> = {
  'identity': 1,
  'reversal': 0,
  'reversal with noise': 0,
};

describe.each(NULLINGS)('nulling %s, N = 0..64', (_name, nulling) => {
  it.each(LAYOUTS)('%s: the factors give the target back; bar and cross are exact', (layout) => {
    for (const modes of SIZES) {
      const mirror = MIRRORS[modes % MIRRORS.length]!;
      if (modes === 0) {
        expect(() => createMesh(layout, modes, mirror)).toThrow(RangeError);
        continue;
      }
      const mesh = createMesh(layout, modes, mirror);
      for (const [name, target] of unitaryMatrices(modes)) {
        const factors = decomposeWith(nulling, target, mesh);
        const where = `${name}, N = ${modes}, ${mirror}`;
        // LAPACK's habit: 30 N eps; less than 2 were seen.
        expect(lapackResidual(target, reconstruct(factors)), where).toBeLessThan(30);
        const state = ONLY_STATE[name];
        if (state !== undefined) {
          expect(
            factors.cosine.every((c) => c === state),
            where,
          ).toBe(true);
          expect(
            factors.sineRe.every((s) => Math.abs(s) === 1 - state),
            where,
          ).toBe(true);
          expect(
            factors.sineIm.every((s) => s === 0),
            where,
          ).toBe(true);
        }
      }
    }
  });
});

describe('both nullings', () => {
  const numbers = ({ cosine, sineRe, sineIm, diagonal, diagonalBefore }: Decomposition): number[] => [
    ...cosine,
    ...sineRe,
    ...sineIm,
    ...diagonal,
    ...diagonalBefore,
  ];

  it.each(LAYOUTS)('%s: have the same result to the last bit', (layout) => {
    for (const modes of SIZES.slice(1)) {
      const mirror = MIRRORS[(modes + 1) % MIRRORS.length]!;
      const mesh = createMesh(layout, modes, mirror);
      for (const [name, target] of unitaryMatrices(modes)) {
        const [a, b] = NULLINGS.map(([, nulling]) => numbers(decomposeWith(nulling, target, mesh)));
        expect(
          a!.every((value, k) => value === b![k]),
          `${name}, N = ${modes}`,
        ).toBe(true);
      }
    }
  });

  it('do not depend on what was nulled before, when the memory has grown too', () => {
    const mesh = createMesh('rectangular', 9);
    const target = haarUnitary(9, 3);
    const before = numbers(decomposeWith(nullOnKernels, target, mesh));
    for (const modes of [64, 65, 130, 5]) {
      const larger = haarUnitary(modes, 4);
      const factors = decomposeWith(nullOnKernels, larger, createMesh('rectangular', modes));
      expect(lapackResidual(larger, reconstruct(factors))).toBeLessThan(30);
      expect(numbers(decomposeWith(nullOnKernels, target, mesh))).toEqual(before);
    }
  });
});
