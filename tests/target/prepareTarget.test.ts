import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { frobeniusNorm, unitarityDefect } from '../../src/matrix/norms.js';
import { adjoint, multiply, subtract } from '../../src/matrix/products.js';
import { parsePorts } from '../../src/target/parsePorts.js';
import { prepareTarget } from '../../src/target/prepareTarget.js';
import { distance, faultOf } from './support.js';

function diagonal(values: readonly number[]): ComplexMatrix {
  const matrix = zeroMatrix(values.length, values.length);
  values.forEach((value, k) => (matrix.re[k * values.length + k] = value));
  return matrix;
}

describe('orientation', () => {
  const matrix = matrixFromRows([
    [0, [0, 1], 0],
    [0, 0, 1],
    [-1, 0, 0],
  ]);

  it('transposes and conjugates as asked, each alone and both', () => {
    expect(prepareTarget(matrix).matrix).toEqual(matrix);
    expect(prepareTarget(matrix, { transpose: true }).matrix.im[3]).toBe(1);
    expect(prepareTarget(matrix, { conjugate: true }).matrix.im[1]).toBe(-1);
    const both = prepareTarget(matrix, { transpose: true, conjugate: true }).matrix;
    expect(distance(multiply(both, matrix), identityMatrix(3))).toBe(0);
  });

  it('leaves what came in alone', () => {
    const before = structuredClone(matrix);
    prepareTarget(matrix, { transpose: true, conjugate: true, nearest: true, ports: [2, 4], modes: 6 });
    expect(matrix).toEqual(before);
  });
});

describe('unitarity', () => {
  const stretched = diagonal([1, 1.001]);

  it('is refused over the limit, with the measured defect and the remedy', () => {
    const fault = faultOf(() => prepareTarget(stretched), 'target/not-unitary');
    // 1.001^2 - 1 = 2.001e-3
    expect(fault.message).toMatch(/0\.002001, over the limit of 0\.000001/);
    expect(fault.remedy).toMatch(/--nearest/);
    expect(prepareTarget(stretched, { unitaryWithin: 0.0021 })).toMatchObject({ nearestDistance: null });
    expect(prepareTarget(stretched, { unitaryWithin: 0.0021 }).unitarityDefect).toBeCloseTo(0.002001, 12);
    faultOf(() => prepareTarget(stretched, { unitaryWithin: 0.002 }), 'target/not-unitary');
  });

  it('is refused for NaN and for a limit that is none', () => {
    faultOf(() => prepareTarget(diagonal([1, NaN])), 'target/not-unitary');
    faultOf(() => prepareTarget(diagonal([1, NaN]), { nearest: true }), 'target/not-finite');
    faultOf(() => prepareTarget(diagonal([1, 1]), { unitaryWithin: NaN }), 'target/unitary-within');
    faultOf(() => prepareTarget(diagonal([1, 1]), { unitaryWithin: -1 }), 'target/unitary-within');
    faultOf(() => prepareTarget(diagonal([1e200, 1e200]), { nearest: true }), 'target/not-unitary');
    faultOf(() => prepareTarget(zeroMatrix(2, 3)), 'target/not-square');
    faultOf(() => prepareTarget(zeroMatrix(0, 0)), 'target/empty');
  });
});

describe('the nearest unitary', () => {
  it('of [[1, 1], [0, 1]] is [[2, 1], [-1, 2]]/sqrt(5)', () => {
    // Closed form by hand: M^T M = [[1, 1], [1, 2]], singular values (sqrt(5) +- 1)/2, so the squared
    // distance is the sum of (s - 1)^2 = ((sqrt(5) - 1)/2)^2 + ((sqrt(5) - 3)/2)^2 = 5 - 2 sqrt(5).
    const {
      matrix,
      unitarityDefect: defect,
      nearestDistance,
    } = prepareTarget(
      matrixFromRows([
        [1, 1],
        [0, 1],
      ]),
      { nearest: true },
    );
    const r = 1 / Math.sqrt(5);
    const expected = matrixFromRows([
      [2 * r, r],
      [-r, 2 * r],
    ]);
    expect(distance(matrix, expected)).toBeLessThan(1e-15);
    expect(nearestDistance).toBeCloseTo(Math.sqrt(5 - 2 * Math.sqrt(5)), 14);
    expect(defect).toBe(1);
  });

  it('is no farther than any other unitary (Fan and Hoffman 1955)', () => {
    const noise = haarUnitary(5, 2);
    const target = haarUnitary(5, 1);
    for (let k = 0; k < target.re.length; k++) target.re[k]! += 0.1 * noise.re[k]!;
    const { matrix, nearestDistance } = prepareTarget(target, { nearest: true });
    expect(unitarityDefect(matrix)).toBeLessThan(1e-14);
    expect(nearestDistance).toBeCloseTo(frobeniusNorm(subtract(target, matrix)), 14);
    expect(nearestDistance).toBeLessThan(frobeniusNorm(subtract(target, haarUnitary(5, 1))));
    // U^dagger M is Hermitian positive definite: what the polar decomposition means.
    const factor = multiply(adjoint(matrix), target);
    expect(distance(factor, adjoint(factor))).toBeLessThan(1e-14);
  });

  it('is taken also within the tolerance, and its distance reported', () => {
    const { matrix, nearestDistance } = prepareTarget(diagonal([1, 1 + 1e-8]), { nearest: true });
    expect(distance(matrix, identityMatrix(2))).toBeLessThan(1e-15);
    expect(nearestDistance).toBeCloseTo(1e-8, 15);
  });

  it('does not exist for a singular target', () => {
    const fault = faultOf(() => prepareTarget(diagonal([2, 1, 0]), { nearest: true }), 'target/singular');
    expect(fault.message).toMatch(/smallest singular value is 0, its largest 2/);
    faultOf(() => prepareTarget(diagonal([1, 1e-17]), { nearest: true }), 'target/singular');
    faultOf(() => prepareTarget(zeroMatrix(2, 2), { nearest: true }), 'target/singular');
    expect(distance(prepareTarget(diagonal([1, 1e-12]), { nearest: true }).matrix, identityMatrix(2))).toBe(
      0,
    );
  });
});

describe('ports', () => {
  const target = haarUnitary(2, 4);

  it('places the target, and the identity elsewhere', () => {
    const { matrix, unitarityDefect: defect } = prepareTarget(target, { ports: [3, 4], modes: 5 });
    for (let i = 0; i < 5; i++) {
      for (let j = 0; j < 5; j++) {
        const inside = i >= 2 && i <= 3 && j >= 2 && j <= 3;
        const k = (i - 2) * 2 + (j - 2);
        expect([matrix.re[i * 5 + j], matrix.im[i * 5 + j]]).toEqual(
          inside ? [target.re[k], target.im[k]] : [i === j ? 1 : 0, 0],
        );
      }
    }
    expect(defect).toBe(unitarityDefect(target));
    expect(prepareTarget(target, { ports: [1, 2], modes: 2 }).matrix).toEqual(target);
  });

  it.each([
    [[4, 6], 5, /ports 4-6 do not lie on a chip of 5 ports/],
    [[0, 1], 5, /ports 0-1/],
    [[4, 3], 5, /ports 4-3/],
    [[1.5, 2.5], 5, /ports 1.5-2.5/],
    [[NaN, 2], 5, /ports NaN-2/],
    [[2, 4], 5, /ports 2-4 are 3 ports, the target has 2/],
    [[2, 2], 5, /ports 2-2 are 1 port, the target has 2/],
  ] as const)('%j on %i ports is refused', (ports, modes, message) => {
    expect(faultOf(() => prepareTarget(target, { ports, modes }), 'target/ports').message).toMatch(message);
  });

  it('a target of another size than the chip needs ports', () => {
    expect(faultOf(() => prepareTarget(target, { modes: 5 }), 'target/size').remedy).toMatch(/--ports 1-2/);
    faultOf(() => prepareTarget(haarUnitary(3, 1), { modes: 2 }), 'target/size');
    expect(() => prepareTarget(target, { ports: [1, 2] })).toThrow(RangeError);
  });

  it('reads ranges', () => {
    expect(['3-6', ' 1 - 1 ', '2\u20134', '1-100'].map(parsePorts)).toEqual([
      [3, 6],
      [1, 1],
      [2, 4],
      [1, 100],
    ]);
    for (const text of [
      '',
      '3',
      '6-3',
      '0-2',
      '-1-2',
      '1-2-3',
      'a-b',
      '1.5-2',
      '1e3-2e3',
      '3..6',
      '1-99999999',
    ]) {
      faultOf(() => parsePorts(text), 'target/ports');
    }
  });
});
