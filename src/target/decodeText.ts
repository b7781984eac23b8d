import { InputError } from '../errors/InputError.js';

/** Longest text that is decoded: below the longest string that JavaScript engines hold. */
const MAX_BYTES = 400_000_000;

/**
 * Bytes as text: UTF-8, with or without a byte order mark.
 * @throws InputError `target/not-text` for NUL bytes, other encodings and files beyond 400 MB.
 */
export function decodeText(bytes: Uint8Array): string {
  if (bytes.length > MAX_BYTES) {
    throw new InputError(
      'target/too-large',
      `the text is ${Math.round(bytes.length / 1e6)} MB long, and at most 400 MB is read`,
      'Write a matrix of this size as .npy.',
    );
  }
  if (bytes.includes(0)) throw notText('it holds NUL bytes');
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch (cause) {
    throw notText('it is not UTF-8', cause);
  }
}

function notText(why: string, cause?: unknown): InputError {
  return new InputError(
    'target/not-text',
    `this is not a text file: ${why}`,
    'Save it as UTF-8 text, or give it the ending of its real format (.npy for NumPy arrays).',
    {},
    { cause },
  );
}
