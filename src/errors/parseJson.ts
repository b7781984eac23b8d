import { decodeText } from './decodeText.js';
import { InputError } from './InputError.js';

/** Brackets within brackets that are followed; real documents have fewer than ten, and deeper ones could overflow the stack. */
const MAX_DEPTH = 64;

/**
 * Parses JSON from bytes (UTF-8, a byte order mark allowed).
 * @throws InputError `input/not-text`, `input/empty`, `input/too-deep` or `input/not-json` with row and column (from 1)
 */
export function parseJson(bytes: Uint8Array): unknown {
  const text = decodeText(bytes);
  if (text.trim() === '') {
    throw new InputError('input/empty', 'the file is empty', 'Give a JSON document.');
  }
  requireShallow(text);
  try {
    return JSON.parse(text) as unknown;
  } catch (cause) {
    const reason = cause instanceof Error ? cause.message : String(cause);
    throw new InputError(
      'input/not-json',
      `this is not JSON: ${reason.replace(/ in JSON at position \d+.*$/, '').replace(/, ".*$/s, '')}`,
      'Look for a missing or superfluous comma, quote or bracket at this place.',
      placeOf(text, reason),
      { cause },
    );
  }
}

function placeOf(text: string, reason: string): { row: number; column: number } {
  const position = Number(/at position (\d+)/.exec(reason)?.[1] ?? text.length);
  const before = text.slice(0, position).split('\n');
  return { row: before.length, column: before[before.length - 1]!.length + 1 };
}

function requireShallow(text: string): void {
  let depth = 0;
  let inString = false;
  for (let k = 0; k < text.length; k++) {
    const character = text.charCodeAt(k);
    if (inString) {
      if (character === 0x5c) k++;
      else if (character === 0x22) inString = false;
    } else if (character === 0x22) inString = true;
    else if (character === 0x5b || character === 0x7b) {
      depth++;
      if (depth > MAX_DEPTH) {
        throw new InputError(
          'input/too-deep',
          `the JSON is nested more than ${MAX_DEPTH} levels deep`,
          'A document of this program needs fewer than ten levels.',
        );
      }
    } else if (character === 0x5d || character === 0x7d) depth--;
  }
}
