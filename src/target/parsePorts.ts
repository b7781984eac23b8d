import { InputError } from '../errors/InputError.js';

/**
 * A range of ports as a person writes it, `3-6`: first and last port, counted from 1, both included.
 * @throws InputError `target/ports`.
 */
export function parsePorts(text: string): readonly [first: number, last: number] {
  const found = /^\s*(\d{1,6})\s*[-\u2013]\s*(\d{1,6})\s*$/.exec(text);
  const first = Number(found?.[1] ?? NaN);
  const last = Number(found?.[2] ?? NaN);
  if (first >= 1 && first <= last) return [first, last];
  throw new InputError(
    'target/ports',
    `"${text.slice(0, 40)}" is not a range of ports`,
    'Write the first and the last port, counted from 1, such as 3-6.',
  );
}
