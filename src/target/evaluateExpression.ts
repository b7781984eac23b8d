import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { FormulaEvaluator, isStackOverflow } from './FormulaEvaluator.js';
import { emptyTarget, maxModesOf } from './limits.js';
import { makeLiteralCall, parseLiteralCall } from './literalCall.js';
import { loadFormulaLibrary } from './loadFormulaLibrary.js';
import { SizeBudget } from './SizeBudget.js';

/** Bounds on the evaluation of a formula. */
export interface ExpressionOptions {
  /** Largest number of ports, and of rows or columns of any value on the way; default 1024. */
  readonly maxModes?: number;
  /**
   * Runs the function and throws when it takes too long; without it nothing limits the time. Calls of ours
   * with numbers alone are bounded by their sizes and do without.
   */
  readonly timeLimit?: <T>(run: () => T) => T;
}

const MAX_LENGTH = 100_000;
const MAX_DEPTH = 64;

/**
 * The square matrix that a formula stands for: numbers, `i` (or `j`), `pi`, `tau`, `e`, matrices in brackets
 * (`[1, i; i, 1]/sqrt(2)`), `+ - * / ^ '` and `.* ./ .^`, the usual functions of numbers and matrices, and
 * ours:
 *
 * - `dft(n)`: U_jk = e^{+2 pi i j k / n} / sqrt(n), j and k from 0;
 * - `haar(n, seed)`: a random unitary matrix, the same for the same seed;
 * - `hadamard(n)`: Sylvester's, divided by sqrt(n), n a power of two; `identity(n)`;
 * - `permutation([2,1,3])`: light entering port j leaves at port p_j;
 * - `splitter(k)`: coupling ratio k, symmetric form;
 * - `direct(A, B, ...)`: block diagonal.
 *
 * Calls of ours with numbers as arguments, also within one another, are answered at once; anything else loads
 * mathjs as the parser and the functions. The text is not trusted: only what is on our lists can be named,
 * every size is bounded before memory is taken, and all other work is done within `timeLimit`.
 * @throws InputError `target/syntax`, `target/unknown-name`, `target/forbidden`, `target/ambiguous`,
 * `target/argument`, `target/haar-seed`, `target/too-large`, `target/too-deep`, `target/too-much-work` (also
 * when `timeLimit` throws), `target/not-square`, `target/ragged`, `target/not-finite`, `target/empty`.
 */
export async function evaluateExpression(
  text: string,
  options: ExpressionOptions = {},
): Promise<ComplexMatrix> {
  const budget = new SizeBudget(maxModesOf(options));
  requireModest(text);
  const written = text.replaceAll('\u2212', '-');
  const call = parseLiteralCall(written);
  // Bounded by the sizes alone: the largest takes seconds, and no loop is in it that another argument would
  // make longer.
  if (call !== undefined) return unlessTooDeep(() => makeLiteralCall(call, budget));
  const library = await loadFormulaLibrary();
  return limited(options, () => new FormulaEvaluator(library, budget).evaluate(written));
}

/** Runs within the time limit and tells its error from those of the formula itself. */
function limited<T>({ timeLimit }: ExpressionOptions, run: () => T): T {
  if (timeLimit === undefined) return unlessTooDeep(run);
  let outcome: { value: T } | { error: unknown };
  try {
    outcome = timeLimit(() => {
      try {
        return { value: unlessTooDeep(run) };
      } catch (error) {
        return { error };
      }
    });
  } catch (cause) {
    throw new InputError(
      'target/too-much-work',
      'the formula takes too long',
      'Compute the target elsewhere and give it as a file.',
      {},
      { cause },
    );
  }
  if ('error' in outcome) throw outcome.error;
  return outcome.value;
}

function unlessTooDeep<T>(run: () => T): T {
  try {
    return run();
  } catch (error) {
    throw isStackOverflow(error) ? tooDeep() : error;
  }
}

function requireModest(text: string): void {
  if (text.trim() === '') throw emptyTarget();
  if (text.length > MAX_LENGTH) {
    throw new InputError(
      'target/too-large',
      `the formula is ${text.length} characters long, and at most ${MAX_LENGTH} are read`,
      'Give a long matrix as a file.',
    );
  }
  let depth = 0;
  for (const character of text) {
    if ('([{'.includes(character)) depth++;
    if (')]}'.includes(character)) depth--;
    if (depth > MAX_DEPTH) throw tooDeep();
  }
}

function tooDeep(): InputError {
  return new InputError(
    'target/too-deep',
    'the formula is nested too deeply',
    'Write it with fewer brackets, signs and powers within one another.',
  );
}
