import { describe, expect, it } from 'vitest';
import { markColour, phaseColour, phaseRgb } from '../../src/figure/phaseColour.js';

/** IEC 61966-2-1: linear light of an sRGB channel. */
function linear(channel: number): number {
  const c = channel / 255;
  return c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4;
}

function channels(hex: string): number[] {
  expect(hex).toMatch(/^#[0-9a-f]{6}$/);
  return [1, 3, 5].map((at) => parseInt(hex.slice(at, at + 2), 16));
}

/** CIELAB of an sRGB colour (CIE 15, D65), the way back from what the program does. */
function lab(hex: string): [lightness: number, a: number, b: number] {
  const [r, g, b] = channels(hex).map(linear) as [number, number, number];
  const x = (0.4124564 * r + 0.3575761 * g + 0.1804375 * b) / 0.95047;
  const y = 0.2126729 * r + 0.7151522 * g + 0.072175 * b;
  const z = (0.0193339 * r + 0.119192 * g + 0.9503041 * b) / 1.08883;
  const f = (t: number): number => (t > 216 / 24389 ? Math.cbrt(t) : (24389 / 27 / 116) * t + 16 / 116);
  return [116 * f(y) - 16, 500 * (f(x) - f(y)), 200 * (f(y) - f(z))];
}

function contrast(one: string, other: string): number {
  const luminance = (hex: string): number => {
    const [r, g, b] = channels(hex).map(linear) as [number, number, number];
    return 0.2126 * r + 0.7152 * g + 0.0722 * b;
  };
  const [dark, light] = [luminance(one), luminance(other)].sort((p, q) => p - q) as [number, number];
  return (light + 0.05) / (dark + 0.05);
}

const DEGREE = Math.PI / 180;

describe('the colour of a phase', () => {
  it('is measured with a right yardstick', () => {
    // Bruce Lindbloom's CIE calculator: sRGB red is L* 53.24, a* 80.09, b* 67.20.
    lab('#ff0000').forEach((value, i) => expect(value).toBeCloseTo([53.24, 80.09, 67.2][i]!, 1));
  });

  it('darkens evenly from 0 to pi in grey, and is as dark at 2 pi - phi as at phi', () => {
    for (let degree = 0; degree <= 180; degree += 3) {
      const wanted = 95 - (75 * degree) / 180;
      // Half a step of an 8-bit channel is worth at most 0.3 of lightness in this range.
      expect(Math.abs(lab(phaseColour(degree * DEGREE))[0] - wanted)).toBeLessThan(0.35);
      expect(Math.abs(lab(phaseColour((360 - degree) * DEGREE))[0] - wanted)).toBeLessThan(0.35);
    }
  });

  it('is yellowish up to pi and bluish beyond, the pair of hues that red-green blindness keeps', () => {
    for (let degree = 30; degree <= 150; degree += 10) {
      expect(lab(phaseColour(degree * DEGREE))[2]).toBeGreaterThan(20);
      expect(lab(phaseColour((360 - degree) * DEGREE))[2]).toBeLessThan(-20);
    }
    for (const neutral of [0, Math.PI]) {
      const [, a, b] = lab(phaseColour(neutral));
      expect(Math.hypot(a, b)).toBeLessThan(0.5);
    }
  });

  it('lies inside sRGB everywhere, without clipping', () => {
    for (let degree = 0; degree < 360; degree++) {
      for (const channel of phaseRgb(degree * DEGREE)) {
        expect(channel).toBeGreaterThan(0);
        expect(channel).toBeLessThan(255);
      }
    }
  });

  it('is cyclic and has no jump', () => {
    for (const phase of [0, 0.3, 2, 4, 6]) {
      expect(phaseColour(phase + 2 * Math.PI)).toBe(phaseColour(phase));
      expect(phaseColour(phase - 4 * Math.PI)).toBe(phaseColour(phase));
    }
    expect(phaseColour(2 * Math.PI)).toBe(phaseColour(0));
    for (let degree = 0; degree < 360; degree++) {
      const here = phaseRgb(degree * DEGREE);
      phaseRgb((degree + 1) * DEGREE).forEach((channel, i) => {
        expect(Math.abs(channel - here[i]!)).toBeLessThan(3);
      });
    }
  });

  it('carries a mark with a contrast of at least 4.5 to 1 (WCAG 2.2, 1.4.3)', () => {
    for (let degree = 0; degree < 360; degree++) {
      const phase = degree * DEGREE;
      expect(contrast(markColour(phase), phaseColour(phase))).toBeGreaterThanOrEqual(4.5);
    }
  });
});
