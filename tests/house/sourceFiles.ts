import { readdirSync } from 'node:fs';
import { fileURLToPath } from 'node:url';

/** The folder of the sources. */
export const SOURCES = fileURLToPath(new URL('../../src/', import.meta.url));

/** Paths of all TypeScript files within src/, with forward slashes, sorted. */
export function sourceFiles(): string[] {
  return readdirSync(SOURCES, { recursive: true, encoding: 'utf8' })
    .map((path) => path.replaceAll('\\', '/'))
    .filter((path) => path.endsWith('.ts'))
    .sort();
}
