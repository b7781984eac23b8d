import { expect, it } from 'vitest';
import { nearestEnd, turnIntoRange } from '../../src/chip/turns.js';

const TURN = 2 * Math.PI;

it('moves an angle into a range by the fewest whole turns', () => {
  expect(turnIntoRange(1, null)).toBe(1);
  expect(turnIntoRange(1, [0, 7])).toBe(1);
  expect(turnIntoRange(1, [-10, -5])).toBeCloseTo(1 - TURN, 14);
  expect(turnIntoRange(1, [10, 40])).toBeCloseTo(1 + 2 * TURN, 14);
  expect(turnIntoRange(5, [-3, 3])).toBeCloseTo(5 - TURN, 14);
  expect(turnIntoRange(5, [-8, 8], 2 * TURN)).toBe(5);
  expect(turnIntoRange(5, [-8, 4], 2 * TURN)).toBeCloseTo(5 - 2 * TURN, 14);
});

it('finds no way into a range that holds no equivalent angle', () => {
  expect(turnIntoRange(1, [2, 3])).toBeNaN();
  expect(turnIntoRange(1, [1.1, 1 + TURN - 0.1])).toBeNaN();
});

it('does not leave a range for rounding at its ends', () => {
  expect(turnIntoRange(Math.PI + 4e-16, [0, Math.PI])).toBe(Math.PI);
  expect(turnIntoRange(-1e-15, [0, 1])).toBe(0);
});

it('clamps to the end that is nearest on the circle', () => {
  expect(nearestEnd(3.2, [0, 3])).toBe(3);
  expect(nearestEnd(6.1, [0, 3])).toBe(0);
});
