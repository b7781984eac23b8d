import { describe, expect, it } from 'vitest';
import { angleIn, wrapTurn } from '../../src/units/angle.js';

const TURN = 2 * Math.PI;

describe('wrapTurn', () => {
  it('gives the same direction, in [0, 2 pi)', () => {
    for (let k = -500; k <= 500; k++) {
      const angle = k * 0.137;
      const wrapped = wrapTurn(angle);
      expect(wrapped).toBeGreaterThanOrEqual(0);
      expect(wrapped).toBeLessThan(TURN);
      expect(Math.cos(wrapped)).toBeCloseTo(Math.cos(angle), 12);
      expect(Math.sin(wrapped)).toBeCloseTo(Math.sin(angle), 12);
    }
  });

  it('leaves what is in range as it is, and never gives a whole turn or -0', () => {
    for (const angle of [0, 1e-300, 1, Math.PI, TURN - 1e-15]) expect(wrapTurn(angle)).toBe(angle);
    for (const angle of [-0, TURN, -TURN, -1e-17, -5e-324, 3 * TURN]) expect(wrapTurn(angle)).toBe(0);
  });

  it('takes noise on either side of a whole turn for 0, within the tolerance only', () => {
    for (const angle of [1e-13, -1e-13, TURN - 1e-13, TURN + 1e-13]) {
      expect(wrapTurn(angle, 1e-12)).toBe(0);
      expect(wrapTurn(angle, 1e-14)).not.toBe(0);
    }
  });

  it('lets NaN through, also for an angle without an end', () => {
    for (const angle of [NaN, Infinity, -Infinity]) {
      expect(wrapTurn(angle)).toBeNaN();
      expect(wrapTurn(angle, 1e-12)).toBeNaN();
    }
  });
});

describe('angleIn', () => {
  it('shows half a turn as pi, 1 and 180', () => {
    expect(angleIn('rad', Math.PI)).toBe(Math.PI);
    expect(angleIn('pi', Math.PI)).toBe(1);
    expect(angleIn('deg', Math.PI)).toBe(180);
    expect(angleIn('deg', -Math.PI / 6)).toBeCloseTo(-30, 13);
  });
});
