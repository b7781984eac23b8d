import { existsSync, statSync } from 'node:fs';
import { mkdir, open, readFile, rm, rmdir } from 'node:fs/promises';
import { basename, dirname, join, resolve } from 'node:path';
import { InputError } from '../errors/InputError.js';

/** Name of the temporary file beside a path, of this process alone. */
export function temporaryName(path: string): string {
  return join(dirname(path), `.${basename(path)}.${process.pid}.partial`);
}

/**
 * Writes the content beside the path and returns the temporary file's path; nothing stays behind on failure.
 */
export async function writeTemporary(path: string, content: string | Uint8Array): Promise<string> {
  const temporary = temporaryName(path);
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
 * Makes sure that a file that the user named may be written: nothing stands there, or the same content does
 * already.
 * @throws InputError `output/exists` without `force`, `file/unwritable` for a folder of this name
 */
export async function requireFree(path: string, content: string | Uint8Array, force: boolean): Promise<void> {
  if (!existsSync(path)) return;
  if (statSync(path).isDirectory()) throw unwritable(path, systemError('EISDIR'));
  if (force || (await readFile(path)).equals(Buffer.from(content))) return;
  throw new InputError(
    'output/exists',
    'there is such a file already',
    'Choose another name, or replace it with --force.',
    { source: path },
  );
}

/**
 * Makes a folder and those above it. Returns the topmost one that is new, or undefined when all were there.
 * Step by step: the recursive call of Node never ends where folders cannot be made, as in /proc.
 * @throws InputError `file/unwritable`; what was made by then is removed
 */
export async function makeFolder(path: string): Promise<string | undefined> {
  const missing: string[] = [];
  for (let folder = resolve(path); !existsSync(folder); folder = dirname(folder)) missing.unshift(folder);
  const made: string[] = [];
  try {
    if (missing.length === 0 && !statSync(path).isDirectory()) throw systemError('EEXIST');
    for (const folder of missing) if (await makeOneFolder(folder)) made.push(folder);
    return made[0];
  } catch (error) {
    for (const folder of made.reverse()) await rmdir(folder).catch(() => undefined);
    throw unwritable(path, error);
  }
}

/** Returns false when another run has made the folder meanwhile. */
async function makeOneFolder(path: string): Promise<boolean> {
  try {
    await mkdir(path);
    return true;
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'EEXIST' && statSync(path).isDirectory()) return false;
    throw error;
  }
}

function systemError(code: string): NodeJS.ErrnoException {
  return Object.assign(new Error(code), { code });
}

/** The fault of a place that cannot be written to. */
export function unwritable(path: string, error: unknown): InputError {
  const code = (error as NodeJS.ErrnoException).code ?? '';
  return new InputError(
    'file/unwritable',
    REASONS[code] ?? `it cannot be written (${code || String(error)})`,
    'Choose another place for the results, or make room there.',
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
