import { describe, expect, it } from 'vitest';
import { thinnedNumbers } from '../../src/figure/thinnedNumbers.js';
import { phaseLabel } from '../../src/figure/phaseLabel.js';
import { printableText } from '../../src/figure/printableText.js';
import { cutText, guardedTextWidth, wrapText } from '../../src/figure/textWidth.js';
import { dejaVuWidth } from './dejaVuWidths.js';

describe('phaseLabel', () => {
  it('writes multiples of pi, to three decimals, without trailing zeros', () => {
    const written: [number, string][] = [
      [0, '0'],
      [-0, '0'],
      [1e-9, '0'],
      [Math.PI, 'π'],
      [-Math.PI, '−π'],
      [2 * Math.PI, '2π'],
      [Math.PI / 2, '0.5π'],
      [0.392 * Math.PI, '0.392π'],
      [1.2 * Math.PI, '1.2π'],
      [-0.25 * Math.PI, '−0.25π'],
      [1, '0.318π'],
      [12.3456 * Math.PI, '12.346π'],
    ];
    for (const [phase, label] of written) expect(phaseLabel(phase)).toBe(label);
  });

  it('is within half of a thousandth of pi', () => {
    for (let i = 0; i < 500; i++) {
      const phase = (i / 500) * 2 * Math.PI;
      const label = phaseLabel(phase);
      const back = label === '0' ? 0 : label === 'π' ? 1 : Number(label.replace('π', ''));
      expect(Math.abs(back * Math.PI - phase)).toBeLessThanOrEqual(0.0005 * Math.PI * (1 + 1e-9));
    }
  });
});

describe('guardedTextWidth', () => {
  it('is never less than the width in DejaVu Sans, and not wastefully more', () => {
    for (let code = 32; code < 127; code++) {
      const character = String.fromCharCode(code);
      expect(guardedTextWidth(character, 1), character).toBeGreaterThanOrEqual(dejaVuWidth(character, 1));
    }
    for (const character of 'π−…θφ') {
      expect(guardedTextWidth(character, 1), character).toBeGreaterThanOrEqual(dejaVuWidth(character, 1));
    }
    const line = 'Target: dft(6), 6 ports. Layout: rectangular. Fidelity 0.999872, -0.0006 dB.';
    expect(guardedTextWidth(line, 1)).toBeLessThan(1.12 * dejaVuWidth(line, 1));
    expect(guardedTextWidth(line, 2.5, true)).toBeGreaterThan(dejaVuWidth(line, 2.5, true));
  });
});

describe('cutText and wrapText', () => {
  it('cuts between whole characters, with an ellipsis, within the width', () => {
    expect(cutText('signal', 100, 2)).toBe('signal');
    const cut = cutText('a name far too long', 12, 2);
    expect(cut).toMatch(/^a name f?a?r?…$/);
    expect(dejaVuWidth(cut, 2)).toBeLessThanOrEqual(12);
    expect(cutText('👩‍🔬👩‍🔬👩‍🔬', 8, 1)).toMatch(/^(👩‍🔬){1,2}…$/u);
  });

  it('breaks at blanks, and inside a word only when the word is longer than a line', () => {
    const text = 'one two three four five six seven eight nine ten eleven twelve';
    const lines = wrapText(text, 20, 2);
    expect(lines.join(' ')).toBe(text);
    expect(lines.length).toBeGreaterThan(3);
    for (const line of lines) expect(dejaVuWidth(line, 2)).toBeLessThanOrEqual(20);
    const long = wrapText(`a ${'x'.repeat(40)} b`, 20, 2);
    expect(long.join('').replaceAll(' ', '')).toBe(`a${'x'.repeat(40)}b`);
    for (const line of long) expect(dejaVuWidth(line, 2)).toBeLessThanOrEqual(20);
    expect(wrapText('', 20, 2)).toEqual([]);
  });
});

describe('printableText', () => {
  it('drops control characters, lone surrogates and noncharacters, and keeps markup as it is', () => {
    expect(printableText(' a\u0000b\u001b[31m\tc\n\u2028d\ud800e\ufffe\u202ef <b>&amp; ')).toBe(
      'a b [31m c d e f <b>&amp;',
    );
    expect(printableText('Größe 漢字 👩‍🔬')).toBe('Größe 漢字 👩‍🔬');
  });
});

describe('thinnedNumbers', () => {
  it('keeps the first and the last number, and the distance', () => {
    expect(thinnedNumbers(6, 0.4)).toEqual([1, 2, 3, 4, 5, 6]);
    expect(thinnedNumbers(1, 3)).toEqual([1]);
    expect(thinnedNumbers(64, 1.1)).toEqual([1, 5, 10, 15, 20, 25, 30, 35, 40, 45, 50, 55, 60, 64]);
    for (let count = 1; count < 130; count += 3) {
      for (const distance of [0.5, 1, 1.4, 2.2, 4.5, 7, 30]) {
        const numbers = thinnedNumbers(count, distance);
        expect(numbers[0]).toBe(1);
        for (let i = 1; i < numbers.length; i++) {
          expect(numbers[i]! - numbers[i - 1]!).toBeGreaterThanOrEqual(distance);
        }
        expect(count - numbers.at(-1)!).toBeLessThan(Math.max(1, distance));
      }
    }
  });
});
