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
 * @throws InputError that names the field: syntax, unknown keys (with the nearest known one), wrong types, numbers out of
 * range, cells or shifters that do not exist or are listed twice, lists of the wrong length, a newer format
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
  const { measuredCells } = document as { measuredCells?: unknown };
  const wellFormed = Array.isArray(measuredCells) && measuredCells.every(isMeasuredCell);
  const parsed = chipFileSchema.safeParse(wellFormed ? { ...document, measuredCells: [] } : document);
  if (!parsed.success) {
    const { field, what, remedy } = describeIssue(chipFileSchema, document, parsed.error.issues);
    throw chipFault(field, what, remedy);
  }
  const file: ChipFile = wellFormed ? { ...parsed.data, measuredCells } : parsed.data;
  return { file, chip: resolveChip(file) };
}

type MeasuredCell = NonNullable<ChipFile['measuredCells']>[number];

/**
 * True for an entry that the schema takes too. A measured chip of 1024 ports has half a million of them, for which the schema
 * needs a second and this check a few milliseconds; what it does not take, the schema judges and explains.
 */
function isMeasuredCell(entry: unknown): entry is MeasuredCell {
  if (typeof entry !== 'object' || entry === null || Object.keys(entry).length !== 2) return false;
  const { cell, couplingRatio } = entry as { cell?: unknown; couplingRatio?: unknown };
  return (
    Number.isSafeInteger(cell) &&
    (cell as number) >= 1 &&
    Array.isArray(couplingRatio) &&
    couplingRatio.length === 2 &&
    couplingRatio.every((ratio) => typeof ratio === 'number' && ratio >= 0 && ratio <= 1)
  );
}
