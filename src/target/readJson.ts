import { InputError } from '../errors/InputError.js';
import { parseJsonText } from '../errors/parseJson.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import type { Complex } from './Complex.js';
import { cut, emptyTarget, notFinite, requireSquare } from './limits.js';
import { parseEntry } from './parseEntry.js';

/**
 * A matrix from JSON: `{"matrix": [[...]]}` or a bare array of rows; an entry is a number, `[re, im]`,
 * `{"re": .., "im": ..}` or a scalar in quotes as `parseEntry` reads it. Other keys beside `matrix` are
 * ignored.
 * @throws InputError as `parseJsonText`, `target/json` (no matrix in it), `target/wrong-file` (a chip or a
 * table), `target/empty`, `target/ragged`, `target/not-square`, `target/too-large`, and those of
 * `parseEntry`.
 */
export function readJson(text: string, maxModes: number): ComplexMatrix {
  if (text.trim() === '') throw emptyTarget();
  const rows = rowsOf(parseJsonText(text));
  const width = rows.map((row, i) => {
    if (!Array.isArray(row)) throw notARow(row, i);
    return row.length;
  });
  const ragged = width.findIndex((columns) => columns !== width[0]);
  if (ragged >= 0) {
    throw new InputError(
      'target/ragged',
      `${width[ragged]} ${width[ragged] === 1 ? 'entry' : 'entries'}, but row 1 has ${width[0]}`,
      'Give every row the same number of entries.',
      { row: ragged + 1 },
    );
  }
  requireSquare(rows.length, width[0] ?? 0, maxModes);
  return entriesOf(rows as readonly (readonly unknown[])[]);
}

function entriesOf(rows: readonly (readonly unknown[])[]): ComplexMatrix {
  const modes = rows.length;
  const matrix = zeroMatrix(modes, modes);
  rows.forEach((row, i) => {
    row.forEach((entry, j) => {
      const { re, im } = entryOf(entry, i + 1, j + 1);
      if (!(Number.isFinite(re) && Number.isFinite(im))) throw notFinite(shown(entry), i + 1, j + 1);
      matrix.re[i * modes + j] = re;
      matrix.im[i * modes + j] = im;
    });
  });
  return matrix;
}

function entryOf(entry: unknown, row: number, column: number): Complex {
  if (typeof entry === 'number') return { re: entry, im: 0 };
  if (typeof entry === 'string') return parseEntry(entry, row, column);
  if (Array.isArray(entry) && entry.length === 2) {
    const [re, im] = entry as unknown[];
    if (typeof re === 'number' && typeof im === 'number') return { re, im };
  }
  if (isRecord(entry)) {
    const keys = Object.keys(entry);
    const { re, im } = entry;
    if (keys.length === 2 && typeof re === 'number' && typeof im === 'number') return { re, im };
  }
  throw new InputError(
    'target/entry',
    `${shown(entry)} is not an entry`,
    'An entry is a number, [re, im], {"re": .., "im": ..} or a number in quotes such as "1/sqrt(2)".',
    { row, column },
  );
}

function rowsOf(document: unknown): readonly unknown[] {
  if (Array.isArray(document)) return document;
  if (!isRecord(document)) throw noMatrix(`it holds ${shown(document)}`);
  if (!Object.hasOwn(document, 'matrix')) {
    const instead = otherFile(document);
    if (instead === undefined) throw noMatrix('it has no key "matrix"');
    throw new InputError(
      'target/wrong-file',
      `this is ${instead}, not a target matrix: it has no key "matrix"`,
      'Give the matrix here, as {"matrix": [[...], ...]}, .csv, .npy or .mtx.',
    );
  }
  if (!Array.isArray(document['matrix'])) throw noMatrix(`"matrix" holds ${shown(document['matrix'])}`);
  return document['matrix'];
}

function otherFile(document: Record<string, unknown>): string | undefined {
  if (Object.hasOwn(document, 'phases')) return 'a phase table';
  if (Object.hasOwn(document, 'modes')) return 'a chip file';
  if (Object.hasOwn(document, 'runId')) return 'a report';
  return Object.hasOwn(document, 'format') ? 'another file of this program' : undefined;
}

function noMatrix(why: string): InputError {
  return new InputError(
    'target/json',
    `there is no matrix in the JSON: ${why}`,
    'Write {"matrix": [[...], [...]]} or an array of rows [[...], [...]].',
  );
}

function notARow(row: unknown, i: number): InputError {
  return new InputError(
    'target/json',
    `${shown(row)} is not a row`,
    'Write each row as an array of entries.',
    {
      row: i + 1,
    },
  );
}

function isRecord(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
}

function shown(value: unknown): string {
  if (Array.isArray(value)) return value.length > 8 ? 'a long array' : cut(JSON.stringify(value));
  if (isRecord(value)) return 'an object';
  return cut(JSON.stringify(value) ?? 'nothing');
}
