import { parse } from 'csv-parse/sync';
import { decodeText } from '../errors/decodeText.js';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import { parseJson } from '../errors/parseJson.js';
import type { ShifterRole } from '../chip/shifters.js';
import type { ReadChip } from '../chip/readChip.js';
import { chipFromDocument } from '../chip/readChip.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import type { PhaseRow } from './PhaseTable.js';
import { PHASE_TABLE_HEADER } from './PhaseTable.js';
import { TABLE_FORMAT } from './formatPhaseJson.js';

/** What a phase table says of its origin; only the JSON kind does. */
export interface TableOrigin {
  readonly targetSource: string;
  readonly target: ComplexMatrix;
  readonly chip: ReadChip;
}

/** A phase table as it was read. */
export interface ReadTable {
  readonly rows: readonly PhaseRow[];
  readonly origin: TableOrigin | null;
}

const ROLES: readonly ShifterRole[] = ['input', 'external', 'internal', 'output'];

/**
 * Reads a phase table of either kind: CSV, known by its header line, or JSON, known by its `format` key.
 * @throws InputError `table/...` with the row (from 1, not counting the header line) and what is wrong there
 */
export function readPhaseTable(bytes: Uint8Array): ReadTable {
  const start = new TextDecoder().decode(bytes.subarray(0, 64)).trimStart();
  return start.startsWith('{') ? readJsonTable(bytes) : { rows: readCsvRows(bytes), origin: null };
}

function readCsvRows(bytes: Uint8Array): PhaseRow[] {
  const text = decodeText(bytes);
  if (text.trim() === '') {
    throw new InputError(
      'table/empty',
      'the file is empty',
      `A phase table begins with ${PHASE_TABLE_HEADER}`,
    );
  }
  const header = text
    .slice(0, text.search(/\r|\n|$/))
    .replaceAll('"', '')
    .replace('\ufeff', '');
  const delimiter = [',', ';', '\t'].find((mark) => hasAllColumns(header.split(mark)));
  if (delimiter === undefined) throw noHeader(header);
  const places = COLUMNS.map((name) =>
    header
      .split(delimiter)
      .map((word) => word.trim())
      .indexOf(name),
  );
  let records: string[][];
  try {
    records = parse(text, { delimiter, from_line: 2, relax_column_count: true, skip_empty_lines: true });
  } catch (cause) {
    throw new InputError(
      'table/csv',
      `this is not CSV: ${cause instanceof Error ? cause.message : String(cause)}`,
      'Look for a quotation mark that is not closed.',
      {},
      { cause },
    );
  }
  return records.map((record, k) => {
    if (record.length !== COLUMNS.length) {
      throw new InputError(
        'table/rows',
        `there are ${record.length} fields, not ${COLUMNS.length}`,
        `The fields are ${PHASE_TABLE_HEADER}`,
        { row: k + 1 },
      );
    }
    const [shifter, cell, role, column, port, phase, name] = places.map((place) => record[place]!.trim());
    const number = (field: string): number | null => (field === '' ? null : numberIn(field, delimiter));
    return checkedRow(
      {
        shifter: number(shifter!),
        cell: number(cell!),
        role: role!,
        column: number(column!),
        port: number(port!),
        phaseRad: number(phase!),
        name: name!,
      },
      k,
    );
  });
}

/** The columns of a table; a spreadsheet may have put them into another order. */
const COLUMNS = PHASE_TABLE_HEADER.split(',');

function hasAllColumns(words: readonly string[]): boolean {
  return (
    words.length === COLUMNS.length && COLUMNS.every((name) => words.some((word) => word.trim() === name))
  );
}

/**
 * A number; where fields are parted by semicolons, a comma is a decimal point, as spreadsheets in much of
 * Europe write it.
 */
function numberIn(field: string, delimiter: string): number {
  return Number(
    delimiter === ';' && /^[-+]?\d*,\d+(e[-+]?\d+)?$/i.test(field) ? field.replace(',', '.') : field,
  );
}

function noHeader(found: string): InputError {
  const shown = found.length > 60 ? `${found.slice(0, 60)}...` : found;
  return new InputError(
    'table/header',
    `this is not a phase table: its first line is "${shown}"`,
    `A phase table begins with ${PHASE_TABLE_HEADER} (phases.csv), or is a phases.json.`,
  );
}

/** A value as it stands in the file, cut; a word that is no number has become NaN by now. */
function shown(value: unknown): string {
  if (typeof value === 'number') return Number.isNaN(value) ? 'not a number' : String(value);
  return (JSON.stringify(value) ?? 'missing').slice(0, 40);
}

type RawRow = { readonly [key in keyof PhaseRow]: unknown };

function checkedRow(raw: RawRow, k: number): PhaseRow {
  const fault = (what: string, remedy: string): InputError =>
    new InputError('table/rows', what, remedy, { row: k + 1 });
  const { shifter, cell, role, column, port, phaseRad, name } = raw;
  const counts = { shifter, cell, column, port };
  for (const [key, value] of Object.entries(counts)) {
    const mayBeEmpty = key === 'cell' || key === 'column';
    if (value === null && mayBeEmpty) continue;
    if (!(Number.isSafeInteger(value) && (value as number) >= 1)) {
      throw fault(`${key} is ${value === null ? 'empty' : shown(value)}`, `${key} is a whole number from 1.`);
    }
  }
  if (!ROLES.includes(role as ShifterRole)) {
    const near = typeof role === 'string' ? nearestName(role, ROLES) : undefined;
    throw fault(
      `there is no role ${shown(role)}`,
      near ? `Did you mean ${near}?` : `Roles are ${ROLES.join(', ')}.`,
    );
  }
  if (!(typeof phaseRad === 'number' && Number.isFinite(phaseRad))) {
    throw fault(
      `the phase is ${phaseRad === null ? 'empty' : shown(phaseRad)}`,
      'A phase is a finite number, in radians.',
    );
  }
  if (typeof name !== 'string') throw fault('the name is not a text', 'Put the name in quotes.');
  return { shifter, cell, role, column, port, phaseRad, name } as PhaseRow;
}

function readJsonTable(bytes: Uint8Array): ReadTable {
  const document = parseJson(bytes) as Readonly<Record<string, unknown>>;
  const { format, shifters, chip, target } = document;
  if (typeof format === 'number' && format > TABLE_FORMAT) {
    throw new InputError(
      'table/format',
      `this phase table has format ${format}, and this version reads format ${TABLE_FORMAT}`,
      'Use a newer version of phasewright.',
      { field: 'format' },
    );
  }
  if (format !== TABLE_FORMAT || !Array.isArray(shifters)) {
    throw new InputError(
      'table/format',
      format === TABLE_FORMAT
        ? 'this JSON file has no shifters'
        : 'this JSON file has no format key of a phase table',
      'Give a phases.json or a phases.csv, as the command phases writes them.',
    );
  }
  const rows = shifters.map((raw: unknown, k) => {
    if (typeof raw !== 'object' || raw === null) {
      throw new InputError('table/rows', 'this entry is no shifter', 'Each entry is an object.', {
        row: k + 1,
      });
    }
    return checkedRow({ cell: null, column: null, name: '', ...raw } as RawRow, k);
  });
  return { rows, origin: { chip: readOwnChip(chip), ...readOwnTarget(target) } };
}

function readOwnChip(document: unknown): ReadChip {
  try {
    return chipFromDocument(document);
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const bare = error.place.field === undefined ? '' : `${error.place.field}: `;
    throw new InputError(error.code, error.message.slice(bare.length), error.remedy, {
      field: error.place.field === undefined ? 'chip' : `chip.${error.place.field}`,
    });
  }
}

function readOwnTarget(document: unknown): { targetSource: string; target: ComplexMatrix } {
  const { source, matrix } = (document ?? {}) as { source?: unknown; matrix?: unknown };
  const fault = (what: string): InputError =>
    new InputError('table/target', what, 'Make the table again with the command phases.', {
      field: 'target.matrix',
    });
  if (!Array.isArray(matrix)) throw fault('the target is missing');
  const modes = matrix.length;
  const target = zeroMatrix(modes, modes);
  matrix.forEach((row: unknown, i) => {
    if (!Array.isArray(row) || row.length !== modes)
      throw fault(`row ${i + 1} does not have ${modes} entries`);
    row.forEach((entry: unknown, j) => {
      const [re, im] = Array.isArray(entry) ? (entry as unknown[]) : [];
      if (!(Number.isFinite(re) && Number.isFinite(im))) {
        throw fault(`entry (${i + 1}, ${j + 1}) is not a pair of numbers`);
      }
      target.re[i * modes + j] = re as number;
      target.im[i * modes + j] = im as number;
    });
  });
  return { targetSource: typeof source === 'string' ? source : '', target };
}
