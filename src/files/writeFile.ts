import { existsSync } from 'node:fs';
import { mkdir, open, rename, rm } from 'node:fs/promises';
import { basename, dirname, join } from 'node:path';
import { InputError } from '../errors/InputError.js';

/**
 * Writes a file whole or not at all: into a temporary file beside it, which then takes its name.
 * @throws InputError `file/unwritable`
 */
export async function writeWhole(path: string, content: string | Uint8Array): Promise<void> {
  const temporary = await writeTemporary(path, content);
  try {
    await rename(temporary, path);
  } catch (error) {
    await rm(temporary, { force: true });
    throw unwritable(path, error);
  }
}

/** Writes the content beside the path and returns the temporary file's path; nothing stays behind on failure. */
export async function writeTemporary(path: string, content: string | Uint8Array): Promise<string> {
  const temporary = join(dirname(path), `.${basename(path)}.${process.pid}.partial`);
  try {
    const file = await open(temporary, 'w');
    try {
      await file.writeFile(content);
      await file.sync();
    } finally {
      await file.close();
    }
    return temporary;
  } catch (error) {
    await rm(temporary, { force: true }).catch(() => undefined);
    throw unwritable(path, error);
  }
}

/**
 * Writes one file that the user named, unless something stands there.
 * @throws InputError `output/exists` without `force`, `file/unwritable`
 */
export async function writeNamedFile(
  path: string,
  content: string | Uint8Array,
  force: boolean,
): Promise<void> {
  if (!force && existsSync(path)) {
    throw new InputError(
      'output/exists',
      'there is such a file already',
      'Choose another name, or replace it with --force.',
      {
        source: path,
      },
    );
  }
  await makeFolder(dirname(path));
  await writeWhole(path, content);
}

/**
 * Makes a folder and those above it. Returns the topmost one that is new, or undefined when all were there.
 * @throws InputError `file/unwritable`
 */
export async function makeFolder(path: string): Promise<string | undefined> {
  try {
    return await mkdir(path, { recursive: true });
  } catch (error) {
    throw unwritable(path, error);
  }
}

/** The fault of a place that cannot be written to. */
export function unwritable(path: string, error: unknown): InputError {
  const code = (error as NodeJS.ErrnoException).code ?? '';
  return new InputError(
    'file/unwritable',
    REASONS[code] ?? `it cannot be written (${code || String(error)})`,
    'Choose another place with --out, or make room there.',
    { source: path },
    { cause: error },
  );
}

const REASONS: Readonly<Record<string, string>> = {
  EACCES: 'writing there is not allowed',
  EPERM: 'writing there is not allowed',
  EROFS: 'writing there is not allowed',
  ENOTDIR: 'a part of this path is a file, not a folder',
  EEXIST: 'a file of this name is in the way of the folder',
  EISDIR: 'a folder of this name is in the way',
  ENOSPC: 'the disk is full',
  ENOENT: 'there is no such folder',
  ENAMETOOLONG: 'the name is too long',
};
