import { describe, expect, it } from 'vitest';
import type { CellStyle } from '../../src/chip/Chip.js';
import {
  applyExternalInPlace,
  applyOuterSplitterInPlace,
  writeArms,
  writeSplitArms,
} from '../../src/chip/cellTransfer.js';
import { REFERENCE_STYLE } from '../../src/chip/idealChip.js';
import { cellReach, missedStates } from '../../src/chip/reach.js';
import type { ComplexMatrix, Entry } from '../../src/matrix/ComplexMatrix.js';
import { matrixFromRows } from '../../src/matrix/ComplexMatrix.js';
import { multiply, turnPhase } from '../../src/matrix/products.js';
import { maxDifference } from '../support/matrices.js';

/** T(theta, phi) of a cell, through the functions that solver and simulation use. */
function cell(style: CellStyle, theta: number, phi: number, first = 0.5, second = 0.5): ComplexMatrix {
  const arms = new Float64Array(4);
  const transfer = new Float64Array(8);
  writeArms(arms, style.internal, theta, 1);
  writeSplitArms(transfer, style.splitterForm, first, second, arms);
  applyExternalInPlace(transfer, style.external, Math.cos(phi), Math.sin(phi));
  const entry = (k: number): Entry => [transfer[2 * k]!, transfer[2 * k + 1]!];
  return matrixFromRows([
    [entry(0), entry(1)],
    [entry(2), entry(3)],
  ]);
}

function times(z: Entry, angle: number): Entry {
  const [x, y] = typeof z === 'number' ? [z, 0] : z;
  return [x * Math.cos(angle) - y * Math.sin(angle), x * Math.sin(angle) + y * Math.cos(angle)];
}

/** M(theta, phi) = i e^{i theta/2} [[e^{i phi} s, c], [e^{i phi} c, -s]]: convention A of check-values. */
function reference(theta: number, phi: number): ComplexMatrix {
  const s = Math.sin(theta / 2);
  const c = Math.cos(theta / 2);
  return turnPhase(
    matrixFromRows([
      [times(s, phi), c],
      [times(c, phi), -s],
    ]),
    Math.PI / 2 + theta / 2,
  );
}

const ANGLES: readonly [number, number][] = [
  [0, 0],
  [Math.PI, 0],
  [1.1, 0.4],
  [2.9, 5.1],
  [0.3, 3.3],
];

// check-values section 4, equalities derived and checked to 1e-15 there.
describe('conversions between conventions', () => {
  const style = (change: Partial<CellStyle>): CellStyle => ({ ...REFERENCE_STYLE, ...change });

  it.each(ANGLES)('theta %d, phi %d', (theta, phi) => {
    const same = (a: ComplexMatrix, b: ComplexMatrix): void =>
      expect(maxDifference(a, b)).toBeLessThan(1e-15);
    same(cell(REFERENCE_STYLE, theta, phi), reference(theta, phi));
    // Lower arm: e^{i theta} M(-theta, phi).
    same(cell(style({ internal: 'lower' }), theta, phi), turnPhase(reference(-theta, phi), theta));
    // Differential: e^{-i theta/2} M(theta, phi).
    same(cell(style({ internal: 'differential' }), theta, phi), turnPhase(reference(theta, phi), -theta / 2));
    // Phase on the lower input: e^{i phi} M(theta, -phi).
    same(cell(style({ external: 'lower-input' }), theta, phi), turnPhase(reference(theta, -phi), phi));
    // Phase on the upper output, Reck's form: diag(e^{i phi}, 1) M(theta, 0) = i e^{i theta/2} [[e^{i phi} s,
    // e^{i phi} c], [c, -s]].
    const s = Math.sin(theta / 2);
    const c = Math.cos(theta / 2);
    const reck = turnPhase(
      matrixFromRows([
        [times(s, phi), times(c, phi)],
        [c, -s],
      ]),
      Math.PI / 2 + theta / 2,
    );
    same(cell(style({ external: 'upper-output' }), theta, phi), reck);
    // Real splitters: e^{i theta/2} [[cos, i sin], [i sin, cos]](theta/2), bar at theta = 0.
    const real = turnPhase(
      matrixFromRows([
        [c, [0, s]],
        [[0, s], c],
      ]),
      theta / 2,
    );
    same(cell(style({ splitterForm: 'real' }), theta, 0), real);
  });
});

// check-values section 2: the exact imperfect cell, angles pi/4 + alpha (first) and pi/4 + beta.
describe('imperfect splitters', () => {
  const [alpha, beta] = [0.07, -0.023];
  const first = Math.sin(Math.PI / 4 + alpha) ** 2;
  const second = Math.sin(Math.PI / 4 + beta) ** 2;

  it.each(ANGLES)('have the exact transfer matrix, theta %d, phi %d', (theta, phi) => {
    const x = theta / 2;
    const [sumSine, sumCosine] = [Math.sin(alpha + beta), Math.cos(alpha + beta)];
    const [differenceSine, differenceCosine] = [Math.sin(alpha - beta), Math.cos(alpha - beta)];
    const expected = turnPhase(
      matrixFromRows([
        [
          times([-sumSine * Math.cos(x), differenceCosine * Math.sin(x)], phi),
          [-differenceSine * Math.sin(x), sumCosine * Math.cos(x)],
        ],
        [
          times([differenceSine * Math.sin(x), sumCosine * Math.cos(x)], phi),
          [-sumSine * Math.cos(x), -differenceCosine * Math.sin(x)],
        ],
      ]),
      x,
    );
    expect(maxDifference(cell(REFERENCE_STYLE, theta, phi, first, second), expected)).toBeLessThan(1e-15);
  });

  it('have the reach from |alpha + beta| to pi/2 - |alpha - beta|', () => {
    const { low, high } = cellReach(first, second);
    expect(low).toBeCloseTo(Math.sin(alpha + beta) ** 2, 15);
    expect(high).toBeCloseTo(Math.cos(alpha - beta) ** 2, 15);
    expect(cellReach(0.5, 0.5)).toEqual({ low: 0, high: expect.closeTo(1, 15) as number });
  });

  it('attain every bar power in reach and none beyond, both splitter forms', () => {
    const { low, high } = cellReach(first, second);
    for (const splitterForm of ['symmetric', 'real'] as const) {
      const powers = Array.from({ length: 401 }, (_, k) => {
        const { re, im } = cell({ ...REFERENCE_STYLE, splitterForm }, (k / 400) * Math.PI, 0, first, second);
        return re[0]! ** 2 + im[0]! ** 2;
      });
      expect(Math.min(...powers)).toBeCloseTo(low, 14);
      expect(Math.max(...powers)).toBeCloseTo(high, 14);
    }
  });
});

// The whole cell by its own matrices: bar amplitudes over theta and phi, tried on a grid.
describe('a cell of three splitters', () => {
  it.each([
    [0.07, -0.023, 0.1],
    [0.2, 0.2, 0.05],
    [0.2, 0.2, -0.5],
    [0.3, -0.3, 0.02],
    [0.3, -0.3, 0.7],
  ])('misses the states that no phases give it, errors %f, %f, %f', (alpha, beta, gamma) => {
    const [first, second, outer] = [alpha, beta, gamma].map(
      (error) => Math.sin(Math.PI / 4 + error) ** 2,
    ) as [number, number, number];
    for (const splitterForm of ['symmetric', 'real'] as const) {
      for (const external of ['upper-input', 'lower-output'] as const) {
        const style: CellStyle = { internal: 'upper', external, splitterForm, splitters: 3 };
        let [leastBar, leastCross] = [1, 1];
        for (let k = 0; k <= 200; k++) {
          for (let j = 0; j < 200; j++) {
            const arms = new Float64Array(4);
            const transfer = new Float64Array(8);
            writeArms(arms, style.internal, (k / 200) * Math.PI, 1);
            writeSplitArms(transfer, splitterForm, first, second, arms);
            const phi = (j / 100) * Math.PI;
            applyExternalInPlace(transfer, external, Math.cos(phi), Math.sin(phi));
            applyOuterSplitterInPlace(transfer, style, outer);
            leastBar = Math.min(leastBar, Math.hypot(transfer[0]!, transfer[1]!));
            leastCross = Math.min(leastCross, Math.hypot(transfer[2]!, transfer[3]!));
          }
        }
        // A state in reach is met on the grid to about a step; the others miss by more than three.
        const missed = missedStates({ first, second, outer });
        expect([leastBar > 0.03, leastCross > 0.03]).toEqual([missed.cross, missed.bar]);
      }
    }
  });

  it('has its third splitter taken out again', () => {
    const style = (splitterForm: 'real' | 'symmetric', external: CellStyle['external']): CellStyle => ({
      ...REFERENCE_STYLE,
      ...{ splitterForm, external, splitters: 3 },
    });
    for (const form of ['real', 'symmetric'] as const) {
      for (const external of ['upper-input', 'upper-output'] as const) {
        const matrix = Float64Array.from({ length: 10 }, (_, k) => Math.sin(k + 1));
        const before = matrix.slice();
        applyOuterSplitterInPlace(matrix, style(form, external), 0.37, false, 2);
        expect(matrix[2]).not.toBeCloseTo(before[2]!, 3);
        applyOuterSplitterInPlace(matrix, style(form, external), 0.37, true, 2);
        matrix.forEach((value, k) => expect(value).toBeCloseTo(before[k]!, 15));
      }
    }
  });
});

it('is the product of its parts in the order of the light', () => {
  const angle = 0.6;
  const other = 0.9;
  const splitter = (a: number): ComplexMatrix =>
    matrixFromRows([
      [Math.cos(a), [0, Math.sin(a)]],
      [[0, Math.sin(a)], Math.cos(a)],
    ]);
  const phase = (upper: number): ComplexMatrix =>
    matrixFromRows([
      [times(1, upper), 0],
      [0, 1],
    ]);
  const product = [phase(1.3), splitter(angle), phase(0.7), splitter(other)].reduce((light, part) =>
    multiply(part, light),
  );
  const found = cell(REFERENCE_STYLE, 0.7, 1.3, Math.sin(angle) ** 2, Math.sin(other) ** 2);
  expect(maxDifference(found, product)).toBeLessThan(1e-15);
});
