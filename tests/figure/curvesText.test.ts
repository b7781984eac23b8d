import { describe, expect, it } from 'vitest';
import {
  fixedText,
  limitText,
  powerOfTenText,
  quantityText,
  shareText,
  shareWithInterval,
} from '../../src/figure/numberText.js';
import { linearAxis, logAxis } from '../../src/figure/plotAxis.js';

const room = (text: string): number => 1.5 * text.length + 2;

describe('numbers in curve figures', () => {
  it('are decimals at usual sizes and powers of ten beyond, never with a unit prefix', () => {
    const written: [number, string][] = [
      [0, '0'],
      [0.99, '0.99'],
      [0.0001, '0.0001'],
      [0.00123456, '0.00123'],
      [0.0000999, '9.99×10⁻⁵'],
      [0.00009999, '0.0001'],
      [1e-9, '10⁻⁹'],
      [-2.5e-7, '−2.5×10⁻⁷'],
      [123456, '123000'],
      [1.2e12, '1.2×10¹²'],
      [-3, '−3'],
    ];
    for (const [value, text] of written) expect(quantityText(value), String(value)).toBe(text);
    expect([-1, 0, 1, 2, -10].map(powerOfTenText)).toEqual(['10⁻¹', '1', '10', '10²', '10⁻¹⁰']);
    expect([fixedText(-0.001, 2), fixedText(-0.015, 3), fixedText(2, 1)]).toEqual(['0.00', '−0.015', '2.0']);
    expect([limitText(0.999999999), limitText(1 - 1e-12)]).toEqual(['0.999999999', '0.999999999999']);
  });

  it('never round a share to all or none that is neither', () => {
    expect(shareText(10, 10)).toBe('100 %');
    expect(shareText(0, 10)).toBe('0 %');
    expect(shareText(1, 8)).toBe('12.5 %');
    expect(shareText(999_999, 1_000_000)).toBe('99.9999 %');
    expect(shareText(1, 1_000_000)).toBe('0.0001 %');
    expect(shareText(19_999, 20_000)).toBe('99.995 %');
  });

  it('write a share to the digits that its interval resolves', () => {
    expect(shareWithInterval(0.97312, { low: 0.9698, high: 0.9762 })).toBe('97.3 % (97.0 to 97.6)');
    expect(shareWithInterval(0.5, { low: 0.187086, high: 0.812914 })).toBe('50 % (19 to 81)');
    expect(shareWithInterval(0.9999, { low: 0.99944, high: 0.999997 })).toBe('99.99 % (99.94 to 100.00)');
  });
});

describe('axes of curve figures', () => {
  it('have ticks that keep apart, inside the axis, each at its place, over 18 decades of ranges', () => {
    for (let exponent = -12; exponent <= 6; exponent++) {
      for (const [from, to] of [
        [0, 1],
        [0.9, 1],
        [-3.2, 7.7],
        [1, 1.00001],
      ] as const) {
        const [low, high] = [from * 10 ** exponent, to * 10 ** exponent];
        const { ticks, position } = linearAxis(low, high, 70, room);
        expect(ticks.length, `${low} ${high}`).toBeGreaterThanOrEqual(2);
        expect(new Set(ticks.map(({ text }) => text)).size).toBe(ticks.length);
        ticks.forEach(({ value, text }, i) => {
          expect(Math.abs(position(value) - (70 * (value - low)) / (high - low))).toBeLessThan(1e-6);
          expect(text).not.toMatch(/[mkµnGM]/);
          if (i === 0) return;
          const before = ticks[i - 1]!;
          const gap = position(value) - position(before.value);
          expect(gap).toBeGreaterThanOrEqual((room(text) + room(before.text)) / 2);
        });
      }
    }
  });

  it('number decades, and fill in only where there are few', () => {
    const texts = (low: number, high: number): string[] =>
      logAxis(low, high, 70, room).ticks.map(({ text }) => text);
    expect(texts(1e-9, 1e-4)).toEqual(['10⁻⁹', '10⁻⁸', '10⁻⁷', '10⁻⁶', '10⁻⁵', '10⁻⁴']);
    expect(texts(1e-3, 1)).toEqual(['0.001', '0.01', '0.1', '1']);
    expect(texts(0.004, 0.06)).toEqual(['0.005', '0.01', '0.02', '0.05']);
    expect(texts(0.0101, 0.0119)).toEqual(['0.0105', '0.0110', '0.0115']);
    expect(texts(1e-30, 1).length).toBeLessThan(12);
    const { position, minor } = logAxis(0.01, 1, 70, room);
    expect(position(0.1)).toBeCloseTo(35, 10);
    expect([position(0), position(1e-5), position(7)]).toEqual([0, 0, 70]);
    expect(minor).toContain(0.03);
    expect(minor).not.toContain(0.1);
  });
});
