import { readdirSync } from 'node:fs';
import { open } from 'node:fs/promises';
import { basename, dirname } from 'node:path';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';

/** Largest file that is read: sixteen targets of 1024 ports as complex numbers. */
export const MAX_INPUT_BYTES = 256 * 2 ** 20;

/** Why a file could not be read, in words, by the system's code. */
const REASONS: Readonly<Record<string, string>> = {
  ENOENT: 'there is no such file',
  ENOTDIR: 'there is no such file',
  EISDIR: 'this is a folder',
  EACCES: 'reading it is not allowed',
  EPERM: 'reading it is not allowed',
  ENAMETOOLONG: 'the name is too long',
};

const CHECK_PATH = 'Check the path and the folder that you are in.';

const REMEDIES: Readonly<Record<string, string>> = {
  EISDIR: 'Name a file in it.',
  EACCES: 'Ask for the right to read it, or copy it to a place of your own.',
  EPERM: 'Ask for the right to read it, or copy it to a place of your own.',
};

/**
 * All bytes of a file.
 * @throws InputError `file/unreadable` (with the nearest name in the folder) or `file/too-large`
 */
export async function readInputFile(path: string): Promise<Uint8Array> {
  try {
    const file = await open(path, 'r');
    try {
      const status = await file.stat();
      if (status.isDirectory()) throw Object.assign(new Error('folder'), { code: 'EISDIR' });
      if (status.size > MAX_INPUT_BYTES) throw tooLarge(path);
      const chunks: Uint8Array[] = [];
      for await (const chunk of file.createReadStream({ end: MAX_INPUT_BYTES, autoClose: false })) {
        chunks.push(chunk as Uint8Array);
      }
      return joined(chunks, path);
    } finally {
      await file.close();
    }
  } catch (error) {
    if (error instanceof InputError) throw error;
    throw unreadable(path, error);
  }
}

/** All bytes of standard input. @throws InputError `file/too-large` */
export async function readStandardInput(): Promise<Uint8Array> {
  const chunks: Uint8Array[] = [];
  let length = 0;
  for await (const chunk of process.stdin) {
    chunks.push(chunk as Uint8Array);
    length += (chunk as Uint8Array).length;
    if (length > MAX_INPUT_BYTES) throw tooLarge('standard input');
  }
  return joined(chunks, 'standard input');
}

function joined(chunks: readonly Uint8Array[], source: string): Uint8Array {
  const all = Buffer.concat(chunks);
  if (all.length > MAX_INPUT_BYTES) throw tooLarge(source);
  return new Uint8Array(all.buffer, all.byteOffset, all.length);
}

function tooLarge(source: string): InputError {
  return new InputError(
    'file/too-large',
    `this is larger than ${MAX_INPUT_BYTES / 2 ** 20} MB`,
    'Give a smaller file; matrices are smallest as .npy.',
    { source },
  );
}

function unreadable(path: string, error: unknown): InputError {
  const code = (error as NodeJS.ErrnoException).code ?? '';
  const near = code === 'ENOENT' ? nearestName(basename(path), neighbours(path)) : undefined;
  return new InputError(
    'file/unreadable',
    REASONS[code] ?? `it cannot be read (${code || String(error)})`,
    near === undefined ? (REMEDIES[code] ?? CHECK_PATH) : `Did you mean ${near}?`,
    { source: path },
    { cause: error },
  );
}

function neighbours(path: string): string[] {
  try {
    return readdirSync(dirname(path));
  } catch {
    return [];
  }
}
