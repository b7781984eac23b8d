import { InputError } from '../errors/InputError.js';

/** What a reader accepts. */
export interface ReadLimits {
  /** Largest number of rows and columns; default 1024. */
  readonly maxModes?: number;
}

/** Ports that a target may have when the caller sets no limit. */
export const DEFAULT_MAX_MODES = 1024;

/** The limit in force. @throws RangeError when it is not a whole number from 1 to 8192. */
export function maxModesOf(limits: ReadLimits | undefined): number {
  const maxModes = limits?.maxModes ?? DEFAULT_MAX_MODES;
  if (!(Number.isInteger(maxModes) && maxModes >= 1 && maxModes <= 8192)) {
    throw new RangeError(`maxModes is ${maxModes}, not a whole number from 1 to 8192`);
  }
  return maxModes;
}

/** @throws InputError `target/not-square` with the shape, `target/empty`, or `target/too-large`. */
export function requireSquare(rows: number, columns: number, maxModes: number, hint = ''): void {
  if (rows === 0 || columns === 0) throw emptyTarget();
  if (rows > maxModes || columns > maxModes) throw tooLarge(`${rows} x ${columns}`, maxModes);
  if (rows !== columns) {
    throw new InputError(
      'target/not-square',
      `the matrix has ${rows} ${rows === 1 ? 'row' : 'rows'} and ${columns} ${columns === 1 ? 'column' : 'columns'}`,
      hint || 'A target has one row and one column for each port: give a square matrix.',
    );
  }
}

/** The fault of a matrix beyond the limit; `shape` says how large it is. */
export function tooLarge(shape: string, maxModes: number): InputError {
  return new InputError(
    'target/too-large',
    `the matrix is ${shape}, and at most ${maxModes} x ${maxModes} is accepted`,
    'Give a smaller target.',
  );
}

/** The fault of an input without a matrix in it. */
export function emptyTarget(): InputError {
  return new InputError(
    'target/empty',
    'there is no matrix in it',
    'Give a square matrix: one row a line, or a formula such as dft(4).',
  );
}

/** The fault of an entry that is NaN or infinite; row and column count from 1. */
export function notFinite(shown: string, row: number, column: number): InputError {
  return new InputError(
    'target/not-finite',
    `the entry is ${cut(shown)}, not a finite number`,
    'Every entry of a target must be a finite number.',
    { row, column },
  );
}

/** What stands in an input, cut so that an error stays one readable line. */
export function cut(shown: string, length = 40): string {
  const characters = Array.from(shown.slice(0, 2 * length + 2));
  return characters.length > length ? `${characters.slice(0, length).join('')}...` : shown;
}
