import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { copyMatrix, identityMatrix, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { turnPhase } from '../../src/matrix/products.js';
import type { CostDescription } from '../../src/merit/createCost.js';
import { COST_FIGURES, createCost, POWER_SMOOTHING } from '../../src/merit/createCost.js';
import { figuresOfMerit } from '../../src/merit/merit.js';
import { randomStream } from '../../src/random/RandomStream.js';

const DESCRIPTIONS: readonly CostDescription[] = [
  ...COST_FIGURES.map((figure) => ({ figure })),
  { figure: 'portPhaseFreeFidelity', freePorts: 'input' },
];

/** A lossy matrix somewhere near a unitary one. */
function nearby(target: ComplexMatrix, seed: number): ComplexMatrix {
  const random = randomStream(seed, 907);
  const noisy = (values: Float64Array): Float64Array =>
    values.map((value) => 0.8 * value + 0.1 * random.normal());
  return { ...target, re: noisy(target.re), im: noisy(target.im) };
}

function chosen(matrix: ComplexMatrix, inputs: readonly number[]): ComplexMatrix {
  const result = zeroMatrix(matrix.rows, inputs.length);
  for (let row = 0; row < matrix.rows; row++) {
    inputs.forEach((input, k) => {
      result.re[row * inputs.length + k] = matrix.re[row * matrix.columns + input]!;
      result.im[row * inputs.length + k] = matrix.im[row * matrix.columns + input]!;
    });
  }
  return result;
}

describe('costs', () => {
  it('belong to the figures of merit, on all ports', () => {
    for (let modes = 1; modes <= 9; modes++) {
      const target = haarUnitary(modes, modes);
      const achieved = nearby(target, modes);
      for (const description of DESCRIPTIONS) {
        const merit = figuresOfMerit(target, achieved, description.freePorts);
        const cost = createCost(target, description);
        const value = merit[description.figure];
        expect(cost.figure(achieved)).toBeCloseTo(value, 14);
        const found = cost.evaluate(achieved, zeroMatrix(modes, modes));
        if (description.figure === 'powerDistance') {
          expect(found).toBeLessThanOrEqual(value);
          expect(found).toBeGreaterThanOrEqual(value - POWER_SMOOTHING / 2);
        } else expect(found).toBeCloseTo(1 - value, 14);
      }
    }
  });

  it('have the slopes that central differences have, on all ports and on some', () => {
    const target = haarUnitary(6, 2);
    for (const ports of [{}, { inputs: [4, 1], outputs: [0, 2, 3] }]) {
      for (const description of DESCRIPTIONS) {
        const cost = createCost(target, { ...description, ...ports });
        const achieved = chosen(nearby(target, 3), cost.inputs);
        const slope = zeroMatrix(6, cost.inputs.length);
        const unused = zeroMatrix(6, cost.inputs.length);
        cost.evaluate(achieved, slope);
        for (let k = 0; k < achieved.re.length; k++) {
          for (const plane of ['re', 'im'] as const) {
            const step = 1e-6;
            const at = [1, -1].map((sign) => {
              const moved = copyMatrix(achieved);
              moved[plane][k]! += sign * step;
              return cost.evaluate(moved, unused);
            });
            // Truncation step^2 and rounding eps/step, both below 1e-9.
            expect(Math.abs((at[0]! - at[1]!) / (2 * step) - slope[plane][k]!)).toBeLessThan(1e-8);
          }
        }
      }
    }
  });

  it('tell a distance of 1e-20 from none, where 1 - F has long been rounded to 0', () => {
    const target = haarUnitary(5, 4);
    const achieved = turnPhase(target, 0.7);
    achieved.re[3]! += 1e-10;
    for (const description of DESCRIPTIONS.filter(({ figure }) => figure !== 'powerDistance')) {
      const cost = createCost(target, description).evaluate(achieved, zeroMatrix(5, 5));
      // 1 - F = squared length of the change / N, less its part along the target and along free phases.
      expect(cost).toBeGreaterThan(1e-22);
      expect(cost).toBeLessThan(2e-21 + 1e-30);
    }
  });

  // The best there is: all the light of the chosen inputs at the chosen outputs, as in the target.
  it('are 0 for the target where it sends nothing elsewhere, and lose what goes to other outputs', () => {
    const target = identityMatrix(4);
    const ports = { inputs: [1, 2], outputs: [1, 2] };
    for (const description of DESCRIPTIONS) {
      const cost = createCost(target, { ...description, ...ports });
      const right = chosen(target, ports.inputs);
      const leaky = copyMatrix(right);
      // A third of the light of input 2 leaves by output 1, which nobody looks at.
      leaky.re[1 * 2] = Math.sqrt(2 / 3);
      leaky.re[0] = Math.sqrt(1 / 3);
      const slope = zeroMatrix(4, 2);
      expect(cost.evaluate(right, slope)).toBeLessThan(1e-30);
      const lost =
        description.figure === 'powerDistance'
          ? 1 / 6
          : // abs(Tr)^2 / (2 * 2); with a free phase the same.
            (Math.sqrt(2 / 3) + 1) ** 2 / 4;
      expect(cost.figure(leaky)).toBeCloseTo(lost, 14);
    }
  });

  it('count darkness as lost altogether', () => {
    const target = haarUnitary(3, 5);
    for (const description of DESCRIPTIONS) {
      const cost = createCost(target, description);
      const slope = haarUnitary(3, 6);
      expect(cost.evaluate(zeroMatrix(3, 3), slope)).toBe(1);
      expect([...slope.re, ...slope.im].every((value) => value === 0)).toBe(true);
      expect(cost.figure(zeroMatrix(3, 3))).toBe(description.figure === 'powerDistance' ? 1 : 0);
    }
  });

  it('refuse ports that do not exist or to which no light is wanted', () => {
    for (const figure of COST_FIGURES) {
      for (const inputs of [[], [3], [0, 0], [0.5], [-1]]) {
        expect(() => createCost(identityMatrix(3), { figure, inputs })).toThrow(RangeError);
      }
      expect(() => createCost(identityMatrix(3), { figure, inputs: [0], outputs: [2] })).toThrow(InputError);
    }
  });
});
