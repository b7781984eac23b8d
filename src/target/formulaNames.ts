import { InputError } from '../errors/InputError.js';
import type { FormulaValue } from './formulaValue.js';
import { sizesOf } from './formulaValue.js';
import type { SizeBudget } from './SizeBudget.js';

/** Asks the budget for the size of a result before the library makes it. */
type Foresee = (given: readonly FormulaValue[], budget: SizeBudget) => void;

/** The result is no larger than what came in, or a number. */
const noLarger: Foresee = (given, budget) => {
  for (const value of given) budget.spend(sizesOf(value));
};

/** Entry by entry, the smaller operand repeated along the dimensions where it has length 1. */
const broadcast: Foresee = (given, budget) => {
  const all = given.map(sizesOf);
  const levels = Math.max(0, ...all.map((sizes) => sizes.length));
  const aligned = all.map((sizes) => [...Array<number>(levels - sizes.length).fill(1), ...sizes]);
  budget.spend(Array.from({ length: levels }, (_, k) => Math.max(...aligned.map((sizes) => sizes[k]!))));
};

/** Rows of the left by columns of the right. */
const product: Foresee = (given, budget) => {
  let sizes = sizesOf(given[0] ?? 0);
  for (const value of given.slice(1)) {
    const right = sizesOf(value);
    if (sizes.length === 0 || right.length === 0) sizes = [...sizes, ...right];
    else sizes = [...sizes.slice(0, -1), ...right.slice(1)];
    budget.spend(sizes);
  }
};

const kronecker: Foresee = (given, budget) => {
  const all = given.map((value) => [1, 1, ...sizesOf(value)]);
  const along = (fromEnd: number): number => all.reduce((size, sizes) => size * sizes.at(-fromEnd)!, 1);
  budget.spend([along(2), along(1)]);
};

/** zeros(2, 3) or zeros([2, 3]). */
const announced: Foresee = (given, budget) => {
  const sizes = given.flat(1).map((size) => {
    if (typeof size === 'number' && Number.isInteger(size) && size >= 1) return size;
    throw new InputError(
      'target/argument',
      'a size is not a whole number from 1 on',
      'Call it like this: zeros(2, 3).',
    );
  });
  budget.spend(sizes);
};

const diagonal: Foresee = (given, budget) => {
  const [values, shift = 0] = given;
  const sizes = sizesOf(values ?? 0);
  const side = (sizes[0] ?? 0) + (typeof shift === 'number' ? Math.abs(shift) : Infinity);
  if (sizes.length === 1) budget.spend([side, side]);
  else noLarger(given, budget);
};

const sideBySide: Foresee = (given, budget) => {
  const entries = given.reduce<number>(
    (sum, value) => sum + sizesOf(value).reduce((all, size) => all * size, 1),
    0,
  );
  // The side of a square that holds them all: the dimensions themselves are checked on the result.
  const side = Math.ceil(Math.sqrt(entries));
  budget.spend([side, side]);
};

/** Squaring on the way counts exponents in 32 bits: a larger one would come out wrong, not slow. */
const powers: Foresee = (given, budget) => {
  const [base = 0, exponent = 0] = given;
  if (sizesOf(base).length > 0 && !(typeof exponent === 'number' && Math.abs(exponent) < 2 ** 31)) {
    throw new InputError(
      'target/argument',
      'the exponent of a matrix is not a real number below 2^31',
      'Matrix powers take whole exponents; for e^A write expm(A).',
    );
  }
  noLarger(given, budget);
};

/** Functions of the library that a formula may call, with what bounds their results. */
export const LIBRARY_FUNCTIONS: ReadonlyMap<string, Foresee> = new Map([
  ...names('sqrt cbrt exp log log2 log10 sin cos tan asin acos atan sinh cosh tanh', noLarger),
  ...names('abs arg conj re im sign square cube', noLarger),
  ...names('expm inv transpose ctranspose det trace dot unaryMinus unaryPlus', noLarger),
  ...names('add subtract dotMultiply dotDivide dotPow atan2', broadcast),
  ...names('multiply divide', product),
  ...names('zeros ones', announced),
  ...names('pow', powers),
  ...names('kron', kronecker),
  ...names('diag', diagonal),
  ...names('concat', sideBySide),
]);

/** Operators that a formula may use, by the name of the function behind them. */
export const OPERATORS: ReadonlySet<string> = new Set(
  'add subtract multiply divide pow unaryMinus unaryPlus dotMultiply dotDivide dotPow ctranspose'.split(' '),
);

/** Other names for functions of the library. */
export const ALIASES: ReadonlyMap<string, string> = new Map([['adjoint', 'ctranspose']]);

/** Constants that a formula may use; `j` is what engineers write for `i`. */
export const CONSTANTS: ReadonlyMap<string, { re: number; im: number }> = new Map([
  ['i', { re: 0, im: 1 }],
  ['j', { re: 0, im: 1 }],
  ['pi', { re: Math.PI, im: 0 }],
  ['tau', { re: 2 * Math.PI, im: 0 }],
  ['e', { re: Math.E, im: 0 }],
]);

function names(list: string, foresee: Foresee): [string, Foresee][] {
  return list.split(' ').map((name) => [name, foresee]);
}
