import { existsSync, statSync } from 'node:fs';
import { InputError } from '../errors/InputError.js';
import { matrixHash } from '../files/contentHash.js';
import { readInputFile, readStandardInput } from '../files/readInput.js';
import { runWithin } from '../files/timeLimit.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { evaluateExpression } from '../target/evaluateExpression.js';
import type { MatrixFileKind } from '../target/MatrixFileKind.js';
import { kindOfText, MATRIX_FILE_KINDS, matrixFileKind } from '../target/MatrixFileKind.js';
import { parseNpyHeader } from '../target/npyHeader.js';
import { parsePorts } from '../target/parsePorts.js';
import type { PreparedTarget } from '../target/prepareTarget.js';
import { prepareTarget } from '../target/prepareTarget.js';
import { readMatrices } from '../target/readMatrices.js';
import type { TargetOptions } from './commandOptions.js';

/** Formulas stop after so many milliseconds. */
const FORMULA_TIME = 10_000;

/** What an argument TARGET stands for, as it was read. */
export interface RawTarget {
  /** As the user named it: a path, `standard input`, or the formula. */
  readonly source: string;
  /** Set when it is a file. */
  readonly path?: string;
  /** One matrix, or those of a batch. */
  readonly matrices: readonly ComplexMatrix[];
  /** Whether it is a batch: an .npy of shape (K, N, N), even for K = 1. */
  readonly batch: boolean;
}

/** A target ready to be programmed. */
export interface LoadedTarget extends PreparedTarget {
  readonly source: string;
}

/**
 * Reads an argument TARGET: an existing file or a name with a known ending is a file, `-` standard input,
 * anything else a formula.
 * @throws InputError with the source named
 */
export async function readTarget(argument: string): Promise<RawTarget> {
  if (argument === '-') {
    const source = 'standard input';
    const bytes = await readStandardInput();
    return named(source, () => rawTarget({ source }, bytes, kindOfText(bytes)));
  }
  const kind = matrixFileKind(argument);
  if (kind !== undefined) {
    const bytes = await readInputFile(argument);
    return named(argument, () => rawTarget({ source: argument, path: argument }, bytes, kind));
  }
  refuseBareArgument(argument);
  if (existsSync(argument) || looksLikePath(argument)) {
    throw new InputError(
      'target/unknown-ending',
      'no matrix is read from a file with this ending',
      `Known endings are ${MATRIX_FILE_KINDS.map((known) => `.${known}`).join(', ')}.`,
      { source: argument },
    );
  }
  try {
    const timeLimit = <T>(run: () => T): T => runWithin(FORMULA_TIME, run);
    const matrices = [await evaluateExpression(argument, { timeLimit })];
    return { source: argument, matrices, batch: false };
  } catch (error) {
    throw error instanceof InputError ? error.withSource(cut(argument)) : error;
  }
}

function rawTarget(
  origin: Pick<RawTarget, 'source' | 'path'>,
  bytes: Uint8Array,
  kind: MatrixFileKind,
): RawTarget {
  const matrices = readMatrices(bytes, kind);
  return { ...origin, matrices, batch: kind === 'npy' && parseNpyHeader(bytes).shape.length === 3 };
}

/**
 * Applies the options that turn what was read into a target for a chip of `modes` ports (undefined: of its
 * own size).
 * @param index place of the matrix in a batch, from 0
 */
export function prepareLoaded(
  raw: RawTarget,
  matrix: ComplexMatrix,
  options: TargetOptions,
  modes: number | undefined,
  index = 0,
): LoadedTarget {
  if (options.ports !== undefined && modes === undefined) {
    throw new InputError(
      'usage/ports',
      '--ports needs a chip with more ports than the target',
      'Name the chip with --chip.',
    );
  }
  const source = raw.batch ? `${raw.source}, matrix ${index + 1}` : raw.source;
  const prepared = named(source, () =>
    prepareTarget(matrix, {
      transpose: options.transpose === true,
      conjugate: options.conjugate === true,
      nearest: options.nearest === true,
      ...(options.ports === undefined ? {} : { ports: parsePorts(options.ports) }),
      ...(modes === undefined ? {} : { modes }),
      ...(options.unitaryWithin === undefined ? {} : { unitaryWithin: options.unitaryWithin }),
    }),
  );
  return { source, ...prepared };
}

/** The same for a command that takes one matrix. @throws InputError `target/batch` for more than one */
export function theOnlyMatrix(raw: RawTarget): ComplexMatrix {
  const [matrix, second] = raw.matrices;
  if (matrix === undefined || second !== undefined) {
    throw new InputError(
      'target/batch',
      `the file holds ${raw.matrices.length} matrices, and this command takes one`,
      'Batches are for the command phases; write the matrix that you mean into a file of its own.',
      { source: raw.source },
    );
  }
  return matrix;
}

/** Content hash of everything that was read. */
export function rawTargetHash(raw: RawTarget): string {
  return raw.matrices.map(matrixHash).join(' ');
}

/** Runs a reader and names the source in its fault. */
export function named<T>(source: string, read: () => T): T {
  try {
    return read();
  } catch (error) {
    throw error instanceof InputError ? error.withSource(source) : error;
  }
}

/** @throws InputError for an empty argument, and for a folder */
function refuseBareArgument(argument: string): void {
  if (argument.trim() === '') {
    throw new InputError(
      'target/empty',
      'the target is empty',
      'Name a matrix file, or write a formula such as "dft(4)".',
    );
  }
  if (existsSync(argument) && statSync(argument).isDirectory()) {
    throw new InputError('file/unreadable', 'this is a folder', 'Name the matrix file in it.', {
      source: argument,
    });
  }
}

/**
 * A word with an ending is meant as a file, even if there is none: formulas have brackets or operators. So is
 * anything with an ending that other programs give to matrices and tables.
 */
function looksLikePath(argument: string): boolean {
  return (
    /^[\p{L}\p{M}\w./\\: ~-]+\.[A-Za-z]\w{0,7}$/u.test(argument) ||
    /\.(?:mat|npz|pkl|h5|hdf5|xlsx?|ods|dat|parquet)$/i.test(argument)
  );
}

function cut(text: string): string {
  return text.length > 60 ? `${text.slice(0, 60)}...` : text;
}
