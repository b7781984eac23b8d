import { parse } from 'csv-parse/sync';
import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import { cut, emptyTarget, requireSquare, tooLarge } from './limits.js';
import { parseEntry } from './parseEntry.js';

type Delimiter = ',' | ';' | '\t' | ' ';

/**
 * A matrix from separated text: one row a line, entries as `parseEntry` reads them. The separator (semicolon,
 * comma, tab or blanks) is found from the first row. `#` and `%` start a comment that ends with its line;
 * empty lines count for nothing, so rows in errors are rows of the matrix.
 * @throws InputError `target/empty`, `target/ragged`, `target/not-square`, `target/too-large`,
 * `target/header-row`, `target/wrong-file`, `target/separator`, `target/quotes`, `target/blanks-in-entry`,
 * and those of `parseEntry`.
 */
export function readDelimited(text: string, maxModes: number): ComplexMatrix {
  const bare = withoutComments(text);
  const firstLine = /^.*\S.*$/m.exec(bare)?.[0];
  if (firstLine === undefined) throw emptyTarget();
  refuseOtherFiles(firstLine);
  const lines = countFilledLines(bare, maxModes);
  if (lines > maxModes) throw tooLarge(`over ${maxModes} rows long`, maxModes);
  const delimiter = findDelimiter(firstLine);
  const rows = splitRows(bare, delimiter);
  refuseHeader(rows[0] ?? []);
  refuseBlanksInEntries(rows, delimiter);
  requireEvenRows(rows, delimiter);
  requireSquare(rows.length, rows[0]!.length, maxModes, hintOnShape(rows, delimiter));
  return entriesOf(rows);
}

function entriesOf(rows: readonly (readonly string[])[]): ComplexMatrix {
  const modes = rows.length;
  const matrix = zeroMatrix(modes, modes);
  rows.forEach((row, i) => {
    row.forEach((entry, j) => {
      const { re, im } = parseEntry(entry, i + 1, j + 1);
      matrix.re[i * modes + j] = re;
      matrix.im[i * modes + j] = im;
    });
  });
  return matrix;
}

function withoutComments(text: string): string {
  return /[#%]/.test(text) ? text.replace(/[#%][^\r\n]*/g, '') : text;
}

/** Lines with something on them, counted only as far as just beyond the limit. */
function countFilledLines(text: string, limit: number): number {
  const filled = /[^\s][^\r\n]*/g;
  let count = 0;
  while (count <= limit && filled.exec(text) !== null) count++;
  return count;
}

/**
 * Semicolons win, since no entry holds one; a comma beside a blank wins over tabs, which are then padding.
 */
function findDelimiter(firstLine: string): Delimiter {
  const line = firstLine.trim();
  if (line.includes(';')) return ';';
  const tabs = line.includes('\t');
  if (line.includes(',') && (!tabs || /,\s|\s,/.test(line))) return ',';
  return tabs ? '\t' : ' ';
}

function splitRows(text: string, delimiter: Delimiter): string[][] {
  const tidy = delimiter === ' ' ? withSingleBlanks(text) : text;
  try {
    return parse(tidy, {
      delimiter,
      relax_column_count: true,
      skip_empty_lines: true,
      skip_records_with_empty_values: true,
      trim: delimiter !== ' ',
      record_delimiter: ['\r\n', '\n', '\r'],
    });
  } catch (cause) {
    throw new InputError(
      'target/quotes',
      'a quotation mark is not closed, or stands within an entry',
      'Leave quotation marks out, or put a pair of them around a whole entry.',
      {},
      { cause },
    );
  }
}

/**
 * Runs of blanks become one, and blanks within parentheses none: `( 0.5 - 0.5j )` is known to be one entry.
 */
function withSingleBlanks(text: string): string {
  return text
    .replace(/\([^()\r\n]*\)/g, (inside) => inside.replace(/[^\S\r\n]+/g, ''))
    .replace(/[^\S\r\n]+/g, ' ')
    .replace(/^ | $/gm, '');
}

function requireEvenRows(rows: readonly (readonly string[])[], delimiter: Delimiter): void {
  const columns = rows[0]!.length;
  const ragged = rows.findIndex((row) => row.length !== columns);
  if (ragged < 0) return;
  const found = rows[ragged]!.length;
  throw new InputError(
    'target/ragged',
    `${found} ${found === 1 ? 'entry' : 'entries'}, but row 1 has ${columns}`,
    hintOnShape(rows, delimiter) || 'Give every row the same number of entries, with one kind of separator.',
    { row: ragged + 1 },
  );
}

const WRITE_WITHOUT_BLANKS = 'Write entries without blanks inside (0.5-0.5i), or put commas between entries.';

/** What may have gone wrong when the shape is odd; the empty text when nothing is known. */
function hintOnShape(rows: readonly (readonly string[])[], delimiter: Delimiter): string {
  if (rows.some((row) => row.length > 1 && row.at(-1) === '')) return 'End no row with a separator.';
  if (rows.length === 1 && delimiter === ';') return 'Write one row of the matrix a line.';
  // 0.5 -0.5i cannot be told from two entries where blanks separate.
  const broken = rows.some((row) => row.some((entry) => /^[+-].*[ij]$/.test(entry)));
  return delimiter === ' ' && broken ? WRITE_WITHOUT_BLANKS : '';
}

function refuseBlanksInEntries(rows: readonly (readonly string[])[], delimiter: Delimiter): void {
  if (delimiter !== ' ') return;
  for (const [i, row] of rows.entries()) {
    const j = row.findIndex((entry) => /^[-+*/^]$|^[*/^]|[-+*/^]$/.test(entry));
    if (j < 0) continue;
    throw new InputError(
      'target/blanks-in-entry',
      `"${cut(row[j]!)}" is part of an entry: where blanks separate entries, an entry cannot hold one`,
      WRITE_WITHOUT_BLANKS,
      { row: i + 1, column: j + 1 },
    );
  }
}

/** @throws InputError when the first row holds words, most of which cannot be entries. */
function refuseHeader(row: readonly string[]): void {
  const words = row.filter((entry) => /^[A-Za-z_][\w .()-]*$/.test(entry.trim()) && !isEntry(entry));
  if (2 * words.length <= row.length) return;
  throw new InputError(
    'target/header-row',
    `the first row holds words ("${cut(words[0]!.trim())}"), not numbers`,
    'Remove the header row, or start it with #.',
    { row: 1 },
  );
}

function isEntry(text: string): boolean {
  if (/nan|inf/i.test(text)) return true;
  try {
    parseEntry(text, 1, 1);
    return true;
  } catch {
    return false;
  }
}

function refuseOtherFiles(firstLine: string): void {
  const line = firstLine.trim();
  if (/^shifter\s*,\s*cell\s*,/i.test(line)) {
    throw new InputError(
      'target/wrong-file',
      'this is a phase table, not a target matrix',
      'Give the matrix that the table was made for, or use a command that takes a table.',
    );
  }
  if (/^[[{]/.test(line)) {
    throw new InputError(
      'target/separator',
      `the text starts with "${line.slice(0, 1)}"`,
      'Write rows without brackets, one a line; or give JSON the ending .json.',
      { row: 1 },
    );
  }
}
