import { describeIssue } from '../errors/describeIssue.js';
import { parseJson } from '../errors/parseJson.js';
import type { Chip } from './Chip.js';
import { chipFault } from './chipFault.js';
import type { ChipFile } from './chipSchema.js';
import { CHIP_FORMAT, chipFileSchema } from './chipSchema.js';
import { resolveChip } from './resolveChip.js';

/** A chip with the document that describes it; the document goes into reports and phase tables unchanged. */
export interface ReadChip {
  readonly file: ChipFile;
  readonly chip: Chip;
}

/**
 * Reads a chip file.
 * @param bytes JSON in UTF-8
 * @throws InputError that names the field: syntax, unknown keys (with the nearest known one), wrong types,
 * numbers out of range, cells or shifters that do not exist or are listed twice, lists of the wrong length, a
 * newer format
 */
export function readChip(bytes: Uint8Array): ReadChip {
  return chipFromDocument(parseJson(bytes));
}

/** The same for a document that is parsed already, such as the chip inside a phase table. */
export function chipFromDocument(document: unknown): ReadChip {
  if (typeof document !== 'object' || document === null || Array.isArray(document)) {
    throw chipFault('', 'a chip file holds one JSON object', 'The smallest is {"modes": 4}.');
  }
  const format: unknown = (document as { format?: unknown }).format;
  if (typeof format === 'number' && format > CHIP_FORMAT) {
    throw chipFault(
      'format',
      `this chip file has format ${format}, and this version reads format ${CHIP_FORMAT}`,
      'Use a newer version of phasewright.',
    );
  }
  const { measuredCells, shifterOverrides } = document as Readonly<Record<string, unknown>>;
  const lists: Pick<ChipFile, 'measuredCells' | 'shifterOverrides'> = {
    ...(wellFormed(measuredCells, isMeasuredCell) ? { measuredCells } : {}),
    ...(wellFormed(shifterOverrides, isShifterOverride) ? { shifterOverrides } : {}),
  };
  const emptied = Object.fromEntries(Object.keys(lists).map((key) => [key, []]));
  const parsed = chipFileSchema.safeParse({ ...document, ...emptied });
  if (!parsed.success) {
    const { field, what, remedy } = describeIssue(chipFileSchema, document, parsed.error.issues);
    throw chipFault(field, what, remedy);
  }
  const file: ChipFile = { ...parsed.data, ...lists };
  return { file, chip: resolveChip(file) };
}

function wellFormed<T>(list: unknown, test: (entry: unknown) => entry is T): list is T[] {
  return Array.isArray(list) && list.every(test);
}

type MeasuredCell = NonNullable<ChipFile['measuredCells']>[number];
type ShifterOverride = NonNullable<ChipFile['shifterOverrides']>[number];

/**
 * True for an entry that the schema takes too. A measured chip of 1024 ports has half a million of them, for
 * which the schema needs a second and this check a few milliseconds; what it does not take, the schema judges
 * and explains.
 */
function isMeasuredCell(entry: unknown): entry is MeasuredCell {
  if (typeof entry !== 'object' || entry === null) return false;
  const { cell, couplingRatio, lossDb } = entry as Readonly<Record<string, unknown>>;
  if (Object.keys(entry).length !== (lossDb === undefined ? 2 : 3)) return false;
  const losses = lossDb === undefined || isList(lossDb, 3, 0, 1000);
  return isCount(cell) && isList(couplingRatio, 3, 0, 1) && losses;
}

/** The same for shifters with a name or a range. */
function isShifterOverride(entry: unknown): entry is ShifterOverride {
  if (typeof entry !== 'object' || entry === null) return false;
  const { shifter, name, rangeRad } = entry as Readonly<Record<string, unknown>>;
  const keys = 1 + (name === undefined ? 0 : 1) + (rangeRad === undefined ? 0 : 1);
  if (Object.keys(entry).length !== keys || !isCount(shifter)) return false;
  const named = name === undefined || (typeof name === 'string' && name.length >= 1 && name.length <= 200);
  return named && (rangeRad === undefined || isList(rangeRad, 2, -1e4, 1e4));
}

function isCount(value: unknown): value is number {
  return Number.isSafeInteger(value) && (value as number) >= 1;
}

/** Two numbers within limits, or as many as `most`. */
function isList(value: unknown, most: 2 | 3, low: number, high: number): boolean {
  return (
    Array.isArray(value) &&
    value.length >= 2 &&
    value.length <= most &&
    value.every((number) => typeof number === 'number' && number >= low && number <= high)
  );
}
