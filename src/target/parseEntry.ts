import { InputError } from '../errors/InputError.js';
import type { Complex } from './Complex.js';
import { evaluateScalar } from './evaluateScalar.js';
import { cut, notFinite } from './limits.js';

const NUMBER = String.raw`(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?`;
const REAL = new RegExp(`^[+-]?${NUMBER}$`);
const IMAGINARY = new RegExp(String.raw`^([+-]?)\s*(${NUMBER})?\s*\*?\s*(?:[ij]|(?<=[\d.])im)$`);
/** Older NumPy's savetxt writes a negative imaginary part as `+-0.5j`. */
const PAIR = new RegExp(
  String.raw`^([+-]?${NUMBER})\s*(?:\+\s*(?=-))?([+-])\s*(${NUMBER})?\s*\*?\s*(?:[ij]|(?<=[\d.])im)$`,
);
const NOT_FINITE = /(?:^|[^A-Za-z])(?:nan|inf|infinity)(?:(?:[ij]|im)?$|[^A-Za-z])/i;

/**
 * A complex number as NumPy, MATLAB, Julia or a person writes it: `0.5-0.5i`, `(0.5-0.5j)`, `0.5 - 0.5im`,
 * `1e-3`, `1/sqrt(2)`, `exp(i*pi/4)`. Usual literals are read to the last bit, signed zeros included; the
 * rest goes to `evaluateScalar`.
 * @param row row of the matrix from 1, for the error; `column` likewise.
 * @throws InputError `target/entry`, `target/unknown-name`, `target/ambiguous` or `target/not-finite`, with
 * the place.
 */
export function parseEntry(text: string, row: number, column: number): Complex {
  const value = literal(text) ?? evaluated(text, row, column);
  if (!(Number.isFinite(value.re) && Number.isFinite(value.im))) throw notFinite(text.trim(), row, column);
  return value;
}

/** The usual ways to write a complex number, or undefined for anything else. */
function literal(text: string): Complex | undefined {
  if (REAL.test(text)) return { re: Number(text), im: 0 };
  let bare = text.trim();
  if (bare.startsWith('(') && bare.endsWith(')')) bare = bare.slice(1, -1).trim();
  const pair = PAIR.exec(bare);
  if (pair !== null) return { re: Number(pair[1]), im: Number(pair[2]! + (pair[3] ?? '1')) };
  if (REAL.test(bare)) return { re: Number(bare), im: 0 };
  const imaginary = IMAGINARY.exec(bare);
  return imaginary === null ? undefined : { re: 0, im: Number(imaginary[1]! + (imaginary[2] ?? '1')) };
}

function evaluated(text: string, row: number, column: number): Complex {
  const bare = text.trim();
  if (bare === '') {
    throw new InputError(
      'target/entry',
      'there is no number here',
      'Write 0 for an entry that is zero, and end no row with a separator.',
      { row, column },
    );
  }
  if (NOT_FINITE.test(bare)) throw notFinite(bare, row, column);
  if (/^[+-]?\d+,\d+/.test(bare)) {
    throw new InputError(
      'target/entry',
      `"${cut(bare)}" holds a comma`,
      'Write decimals with a point (0.5, not 0,5), and one row of the matrix a line.',
      { row, column },
    );
  }
  try {
    return evaluateScalar(bare);
  } catch (error) {
    throw error instanceof InputError ? at(error, row, column) : error;
  }
}

function at(error: InputError, row: number, column: number): InputError {
  return new InputError(error.code, error.message, error.remedy, { row, column }, { cause: error });
}
