import { createHash } from 'node:crypto';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';

/** SHA-256 of a text or of bytes, as `sha256:` and 64 hexadecimal digits. */
export function contentHash(content: string | Uint8Array): string {
  return `sha256:${createHash('sha256').update(content).digest('hex')}`;
}

/** Hash of a matrix: its shape, then both planes as little-endian doubles. */
export function matrixHash({ rows, columns, re, im }: ComplexMatrix): string {
  const bytes = new Uint8Array(8 + 16 * re.length);
  const view = new DataView(bytes.buffer);
  view.setUint32(0, rows, true);
  view.setUint32(4, columns, true);
  re.forEach((value, k) => view.setFloat64(8 + 8 * k, value, true));
  im.forEach((value, k) => view.setFloat64(8 + 8 * (re.length + k), value, true));
  return contentHash(bytes);
}

/**
 * Identity of a run: a short hash of the command, the contents of its inputs and the options that change its
 * result.
 */
export function runIdentity(
  command: string,
  inputs: Readonly<Record<string, string>>,
  options: Readonly<Record<string, unknown>>,
): string {
  return contentHash(JSON.stringify([command, sortedEntries(inputs), sortedEntries(options)])).slice(7, 23);
}

function sortedEntries(record: Readonly<Record<string, unknown>>): [string, unknown][] {
  return Object.entries(record)
    .filter(([, value]) => value !== undefined)
    .sort(([a], [b]) => (a < b ? -1 : 1));
}
