import { describe, expect, it, vi } from 'vitest';
import { unitarityDefect } from '../../src/matrix/norms.js';
import { evaluateExpression } from '../../src/target/evaluateExpression.js';
import { readMatrices } from '../../src/target/readMatrices.js';
import { bytesOf } from './support.js';

// Loading the library of formulas takes a second: whoever needs none of it must not wait for it.
vi.mock('mathjs', () => {
  throw new Error('mathjs was loaded');
});

describe('without mathjs', () => {
  it.each([
    'dft(4)',
    ' dft( 4 ) ',
    'haar(3, 7)',
    'hadamard(4)',
    'identity(3)',
    'permutation([2, 1, 3])',
    'splitter(0.5)',
    'splitter(1/3)',
    'splitter(sin(pi/8)^2)',
    'direct(dft(2), haar(3, 7))',
    'direct(direct(1, i), -1, exp(i*pi/4), permutation([2,1]))',
  ])('%s is answered', async (text) => {
    expect(unitarityDefect(await evaluateExpression(text))).toBeLessThan(1e-14);
  });

  it('entries of files are answered', () => {
    const text = '1/sqrt(2), exp(i*pi/2)/sqrt(2)\nexp(i*pi/2)/sqrt(2), cos(pi/4)\n';
    expect(unitarityDefect(readMatrices(bytesOf(text), 'csv')[0]!)).toBeLessThan(1e-15);
  });

  it.each(['dft(2)*dft(2)', '[1,0;0,1]', 'dft(n)', 'dft(2', '(dft(2))', 'direct(dft(2), [1,0;0,1])'])(
    '%s needs it',
    async (text) => {
      await expect(evaluateExpression(text)).rejects.toThrow();
      await expect(evaluateExpression(text)).rejects.not.toHaveProperty('code');
    },
  );
});
