import fc from 'fast-check';
import * as mathjs from 'mathjs';
import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';
import { evaluateExpression } from '../../src/target/evaluateExpression.js';

/** Formulas from the grammar of the library, right and wrong in their sizes. */
const { formula } = fc.letrec<{
  formula: string;
  atom: string;
  list: string;
  call: string;
  operation: string;
}>((tie) => ({
  formula: fc.oneof({ maxDepth: 4 }, tie('atom'), tie('operation'), tie('call')),
  atom: fc.oneof(fc.constantFrom('0', '1', '2', '0.5', '-1', 'i', 'pi', 'e', '3e-1', '50%'), tie('list')),
  list: fc.constantFrom(
    ...['[1,2]', '[[1,2]]', '[1;2]', '[1,i;-i,2]', '[0,1;1,0]', '[2,1,0;0,1,i;1,0,1]', '[[1]]', '[1]'],
    ...['[[[1,2],[3,4]],[[5,6],[7,8]]]', '[]', '[[]]', '[1,2;3]', '[[1,0],[0,1],[1,1]]', '[1,2,3;4,5,6]'],
  ),
  operation: fc
    .tuple(tie('formula'), fc.constantFrom('+', '-', '*', '/', '^', '.*', './', '.^', "'"), tie('formula'))
    .map(([a, sign, b]) => (sign === "'" ? `(${a})'` : `(${a}) ${sign} (${b})`)),
  call: fc
    .tuple(
      fc.constantFrom(
        ...['sqrt', 'exp', 'sin', 'abs', 'arg', 'conj', 're', 'im', 'expm', 'inv', 'transpose', 'ctranspose'],
        ...[
          'det',
          'trace',
          'dot',
          'kron',
          'diag',
          'concat',
          'zeros',
          'ones',
          'pow',
          'multiply',
          'divide',
          'add',
        ],
        ...['subtract', 'dotMultiply', 'dotPow', 'atan2', 'log', 'square', 'cbrt', 'unaryMinus'],
      ),
      fc.array(tie('formula'), { minLength: 1, maxLength: 3 }),
    )
    .map(([name, given]) => `${name}(${given.join(', ')})`),
}));

/**
 * What mathjs gives for the text, evaluated by itself: rows of a finite square matrix, or undefined for the
 * rest.
 */
function byLibrary(text: string): mathjs.Complex[][] | undefined {
  const value = mathjs.evaluate(text) as mathjs.Matrix;
  const rows = (mathjs.isMatrix(value) ? value.toArray() : value) as mathjs.MathNumericType[][];
  return rows.map((row) => row.map((entry) => mathjs.complex(entry as mathjs.Complex)));
}

describe('formulas at random', () => {
  it('give what mathjs gives, or an InputError', async () => {
    let matrices = 0;
    await fc.assert(
      fc.asyncProperty(formula, async (text) => {
        const ours = await evaluateExpression(text, { maxModes: 8 }).catch((error: unknown) => {
          if (error instanceof InputError) return undefined;
          throw error;
        });
        if (ours === undefined) return;
        const rows = byLibrary(text)!;
        expect([rows.length, rows[0]!.length]).toEqual([ours.rows, ours.columns]);
        const size = Math.max(1, ...ours.re.map(Math.abs), ...ours.im.map(Math.abs));
        rows.flat().forEach(({ re, im }, k) => {
          // Products are summed in another order: roundings of a few eps of the largest entry, powers of ill
          // matrices aside.
          expect(Math.hypot(re - ours.re[k]!, im - ours.im[k]!)).toBeLessThan(1e-11 * size);
        });
        matrices++;
      }),
      { numRuns: 1500, seed: 11 },
    );
    expect(matrices).toBeGreaterThan(100);
  });

  it('of stray symbols give an InputError or a matrix', async () => {
    const pieces = fc.constantFrom(
      ...[
        'dft(2)',
        'haar(2,1)',
        'direct(',
        'permutation(',
        '[',
        ']',
        '(',
        ')',
        ',',
        ';',
        '+',
        '*',
        '^',
        "'",
        '1',
        'i',
      ],
      ...[
        ' ',
        ':',
        '=',
        '!',
        '%',
        '"',
        '.',
        '{',
        '}',
        '#',
        '\n',
        'x',
        '1e9',
        '\u2212',
        '\\',
        '\u{1f600}',
        '\0',
        '?',
      ],
    );
    await fc.assert(
      fc.asyncProperty(fc.array(pieces, { maxLength: 10 }), async (parts) => {
        await evaluateExpression(parts.join(''), { maxModes: 8 }).catch((error: unknown) => {
          expect(error).toBeInstanceOf(InputError);
        });
      }),
      { numRuns: 1500, seed: 12 },
    );
  });
});
