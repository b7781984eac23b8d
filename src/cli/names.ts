import { basename, dirname, join, resolve } from 'node:path';
import { contentHash } from '../files/contentHash.js';

const LONGEST = 48;

/** A text as a file name: letters, digits and hyphens; a long one is cut and told apart by a hash. */
export function slug(text: string): string {
  const plain = text
    .normalize('NFKD')
    .replaceAll(/\p{M}/gu, '')
    .replaceAll('ß', 'ss')
    .toLowerCase()
    .replaceAll(/[^a-z0-9]+/g, '-')
    .replaceAll(/^-+|-+$/g, '');
  if (plain.length > 0 && plain.length <= LONGEST) return plain;
  return `${plain.slice(0, LONGEST)}-${contentHash(text).slice(7, 13)}`.replace(/^-/, '');
}

/** A file's name without its folder and endings. */
export function stem(path: string): string {
  return basename(path).replace(/(\.chip)?\.[^.]+$/, '') || basename(path);
}

/**
 * The folder that a command writes to when it is not told: `out/` and the command with the file's stem or the
 * formula's slug.
 */
export function defaultFolder(
  command: string,
  source: { readonly path?: string; readonly text: string },
): string {
  return join('out', `${command}-${slug(source.path === undefined ? source.text : stem(source.path))}`);
}

/**
 * The same for a command on a phase table. Tables are all called phases.csv: one that stands in a folder of
 * results is told from the others by the folder's name.
 */
export function defaultTableFolder(command: string, path: string): string {
  const folder = basename(dirname(resolve(path)));
  const name = /^phases(-\d+)?$/.exec(stem(path));
  const inResults = name !== null && dirname(path) !== '.' && folder !== '';
  return defaultFolder(command, { text: inResults ? `${folder}${name[1] ?? ''}` : stem(path) });
}
