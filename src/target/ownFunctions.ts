import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { identityMatrix, zeroMatrix } from '../matrix/ComplexMatrix.js';
import { haarUnitary } from '../matrix/haar.js';
import type { Complex } from './Complex.js';
import { requireSquare } from './limits.js';
import type { SizeBudget } from './SizeBudget.js';

/** What a function of ours is called with: a number, a list of numbers (`[2,1,3]`), or a matrix. */
export type OwnArgument = Complex | readonly Complex[] | ComplexMatrix;

interface OwnFunction {
  /** How it is called, for errors. */
  readonly usage: string;
  readonly make: (argumentsGiven: readonly OwnArgument[], budget: SizeBudget) => ComplexMatrix;
}

/**
 * The makers of targets that a formula may call, by name. They throw InputError `target/argument` and as
 * noted.
 */
export const OWN_FUNCTIONS: ReadonlyMap<string, OwnFunction> = new Map([
  ['dft', { usage: 'dft(4)', make: dft }],
  ['haar', { usage: 'haar(4, 1)', make: haar }],
  ['hadamard', { usage: 'hadamard(4)', make: hadamard }],
  ['identity', { usage: 'identity(4)', make: identity }],
  ['permutation', { usage: 'permutation([2,1,3])', make: permutation }],
  ['splitter', { usage: 'splitter(0.5)', make: splitter }],
  ['direct', { usage: 'direct(dft(2), haar(3, 7))', make: direct }],
]);

/**
 * Discrete Fourier transform with positive exponent, U_jk = e^{+2 pi i j k / n} / sqrt(n), j and k from 0.
 */
function dft(given: readonly OwnArgument[], budget: SizeBudget): ComplexMatrix {
  const modes = modesOf('dft', given, 1, budget);
  const matrix = zeroMatrix(modes, modes);
  const roots = Array.from({ length: modes }, (_, k) => rootOfUnity(k, modes));
  const size = Math.sqrt(1 / modes);
  for (let j = 0; j < modes; j++) {
    for (let k = 0; k < modes; k++) {
      const { re, im } = roots[(j * k) % modes]!;
      matrix.re[j * modes + k] = re * size;
      matrix.im[j * modes + k] = im * size;
    }
  }
  return matrix;
}

/** e^{2 pi i k / n}, with quarter turns exact: the zeros of dft(4) are zeros. */
function rootOfUnity(k: number, n: number): Complex {
  const quarter = (4 * k) / n;
  if (Number.isInteger(quarter)) return QUARTER_TURNS[quarter % 4]!;
  const angle = (2 * Math.PI * k) / n;
  return { re: Math.cos(angle), im: Math.sin(angle) };
}

const QUARTER_TURNS: readonly Complex[] = [
  { re: 1, im: 0 },
  { re: 0, im: 1 },
  { re: -1, im: 0 },
  { re: 0, im: -1 },
];

/**
 * @throws InputError `target/haar-seed` without a seed: a random target that cannot be had again is of no
 * use.
 */
function haar(given: readonly OwnArgument[], budget: SizeBudget): ComplexMatrix {
  if (given.length === 1) {
    throw new InputError(
      'target/haar-seed',
      'haar is called without a seed',
      'Give a whole number as the second argument, so that the same target can be had again: haar(4, 1).',
    );
  }
  const modes = modesOf('haar', given, 2, budget);
  const seed = realNumber('haar', given[1]);
  if (!(Number.isSafeInteger(seed) && seed >= 0))
    throw misuse('haar', `the seed ${seed} is not a whole number from 0 on`);
  return haarUnitary(modes, seed);
}

/**
 * Sylvester's construction, divided by sqrt(n): the sign is that of the number of ones that row and column
 * share.
 */
function hadamard(given: readonly OwnArgument[], budget: SizeBudget): ComplexMatrix {
  const modes = modesOf('hadamard', given, 1, budget);
  if (!Number.isInteger(Math.log2(modes))) throw misuse('hadamard', `${modes} is not a power of two`);
  const matrix = zeroMatrix(modes, modes);
  const size = Math.sqrt(1 / modes);
  for (let j = 0; j < modes; j++) {
    for (let k = 0; k < modes; k++) matrix.re[j * modes + k] = oddOnes(j & k) ? -size : size;
  }
  return matrix;
}

function oddOnes(bits: number): boolean {
  let odd = false;
  for (let left = bits; left !== 0; left &= left - 1) odd = !odd;
  return odd;
}

function identity(given: readonly OwnArgument[], budget: SizeBudget): ComplexMatrix {
  return identityMatrix(modesOf('identity', given, 1, budget));
}

/** Light entering port j leaves at port p_j: the entry in row p_j, column j is 1. */
function permutation(given: readonly OwnArgument[], budget: SizeBudget): ComplexMatrix {
  const list = given[0];
  if (given.length !== 1 || !Array.isArray(list)) throw misuse('permutation', 'it takes one list of ports');
  const outputs = (list as readonly Complex[]).map((port) => realNumber('permutation', port));
  const modes = outputs.length;
  budget.spend([modes, modes]);
  requireSquare(modes, modes, budget.maxModes);
  const matrix = zeroMatrix(modes, modes);
  const taken = new Set<number>();
  outputs.forEach((output, j) => {
    if (!(Number.isInteger(output) && output >= 1 && output <= modes)) {
      throw misuse('permutation', `${output} is not a port from 1 to ${modes}`);
    }
    if (taken.has(output)) throw misuse('permutation', `port ${output} stands there twice`);
    taken.add(output);
    matrix.re[(output - 1) * modes + j] = 1;
  });
  return matrix;
}

/** [[cos a, i sin a], [i sin a, cos a]] with sin^2 a the coupling ratio. */
function splitter(given: readonly OwnArgument[], budget: SizeBudget): ComplexMatrix {
  requireCount('splitter', given, 1);
  const couplingRatio = realNumber('splitter', given[0]);
  if (!(couplingRatio >= 0 && couplingRatio <= 1)) {
    throw misuse('splitter', `the coupling ratio ${couplingRatio} does not lie in [0, 1]`);
  }
  budget.spend([2, 2]);
  const stay = Math.sqrt(1 - couplingRatio);
  const cross = Math.sqrt(couplingRatio);
  return {
    rows: 2,
    columns: 2,
    re: Float64Array.of(stay, 0, 0, stay),
    im: Float64Array.of(0, cross, cross, 0),
  };
}

/** Block diagonal, from the top; a number is a block of one port. */
function direct(given: readonly OwnArgument[], budget: SizeBudget): ComplexMatrix {
  if (given.length === 0) throw misuse('direct', 'it takes matrices');
  const blocks = given.map((block, k) => {
    if (isMatrix(block) && block.rows === block.columns) return block;
    if (isNumber(block)) {
      return { rows: 1, columns: 1, re: Float64Array.of(block.re), im: Float64Array.of(block.im) };
    }
    throw misuse('direct', `argument ${k + 1} is not a square matrix`);
  });
  const modes = blocks.reduce((sum, block) => sum + block.rows, 0);
  budget.spend([modes, modes]);
  const matrix = zeroMatrix(modes, modes);
  let from = 0;
  for (const { rows, re, im } of blocks) {
    for (let i = 0; i < rows; i++) {
      const to = (from + i) * modes + from;
      matrix.re.set(re.subarray(i * rows, (i + 1) * rows), to);
      matrix.im.set(im.subarray(i * rows, (i + 1) * rows), to);
    }
    from += rows;
  }
  return matrix;
}

function isMatrix(given: OwnArgument): given is ComplexMatrix {
  return 'rows' in given;
}

function isNumber(given: OwnArgument): given is Complex {
  return !Array.isArray(given) && !isMatrix(given);
}

function modesOf(name: string, given: readonly OwnArgument[], count: number, budget: SizeBudget): number {
  requireCount(name, given, count);
  const modes = realNumber(name, given[0]);
  if (!(Number.isInteger(modes) && modes >= 1)) throw misuse(name, `${modes} is not a number of ports`);
  budget.spend([modes, modes]);
  return modes;
}

function requireCount(name: string, given: readonly OwnArgument[], count: number): void {
  if (given.length === count) return;
  throw misuse(name, `it takes ${count === 1 ? 'one argument' : `${count} arguments`}, not ${given.length}`);
}

function realNumber(name: string, given: OwnArgument | undefined): number {
  if (given === undefined || !isNumber(given))
    throw misuse(name, 'a number should stand where a matrix or list does');
  if (given.im !== 0) throw misuse(name, 'a real number should stand where a complex one does');
  return given.re;
}

function misuse(name: string, why: string): InputError {
  return new InputError(
    'target/argument',
    `${name}: ${why}`,
    `Call it like this: ${OWN_FUNCTIONS.get(name)!.usage}.`,
  );
}
