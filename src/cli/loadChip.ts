import { InputError } from '../errors/InputError.js';
import type { ChipFile } from '../chip/chipSchema.js';
import type { ReadChip } from '../chip/readChip.js';
import { contentHash } from '../files/contentHash.js';
import { readInputFile } from '../files/readInput.js';
import type { ChipOptions } from './commandOptions.js';
import { named } from './loadTarget.js';

/** Reads a chip file. The schema is loaded only when one is read. */
export async function loadChipFile(path: string): Promise<ReadChip> {
  if (!path.toLowerCase().endsWith('.json')) {
    throw new InputError('chip/ending', 'a chip file ends in .chip.json', 'Name the chip file with --chip.', {
      source: path,
    });
  }
  const [bytes, { readChip }] = await Promise.all([readInputFile(path), import('../chip/readChip.js')]);
  return named(path, () => readChip(bytes));
}

/** The chip that the options name, or undefined when they name no file. */
export async function loadNamedChip({ chip }: ChipOptions): Promise<ReadChip | undefined> {
  return chip === undefined ? undefined : loadChipFile(chip);
}

/** An ideal chip in the layout of the options, as a chip file would describe it. */
export async function idealChipFor(
  modes: number,
  { layout = 'rectangular' }: ChipOptions,
): Promise<ReadChip> {
  const { resolveChip } = await import('../chip/resolveChip.js');
  const file = { format: 1 as const, name: `ideal ${layout} ${modes}`, modes, layout };
  return { file, chip: resolveChip(file) };
}

/** A chip's document without the place of its schema, which is told from the chip file's own folder. */
export function withoutSchema({ $schema, ...file }: ChipFile): ChipFile {
  return file;
}

/** Content hash of a chip: of its document without the place of its schema. */
export function chipHash({ file }: ReadChip): string {
  return contentHash(JSON.stringify(withoutSchema(file)));
}
